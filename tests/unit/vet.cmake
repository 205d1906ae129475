# unit tests of src/vet
lopside_unit_test(vet SOURCES test_vet.c vet_desk.c LIBS lopside_vet)
lopside_unit_test(vet_across SOURCES test_vet_across.c vet_desk.c LIBS lopside_vet)
lopside_unit_test(vet_kernels SOURCES test_vet_kernels.c LIBS lopside_vet)
lopside_unit_test(vet_moved SOURCES test_vet_moved.c vet_desk.c LIBS lopside_vet)
