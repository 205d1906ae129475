# unit tests of src/base
lopside_unit_test(base SOURCES test_base.c LIBS lopside_base)
