# unit tests of src/vet
lopside_unit_test(vet SOURCES test_vet.c LIBS lopside_vet)
