# unit tests of src/desk
lopside_unit_test(desk SOURCES test_desk.c LIBS lopside_desk)
