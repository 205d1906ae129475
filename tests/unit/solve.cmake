# unit tests of src/solve
lopside_unit_test(place SOURCES test_place.c test_place_brute.c LIBS lopside_solve)
