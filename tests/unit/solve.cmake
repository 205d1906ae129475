# unit tests of src/solve
lopside_unit_test(place SOURCES test_place.c test_place_brute.c LIBS lopside_solve)
foreach(name regress forecast tolerance answer)
  lopside_unit_test(solve_${name} SOURCES test_solve_${name}.c LIBS lopside_solve)
endforeach()
lopside_unit_test(place_cases SOURCES test_place_cases.c test_place_brute.c LIBS lopside_solve)
