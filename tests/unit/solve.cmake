# unit tests of src/solve
lopside_unit_test(place SOURCES test_place.c test_place_brute.c LIBS lopside_solve)
foreach(name regress forecast tolerance answer outcomes items)
  lopside_unit_test(solve_${name} SOURCES test_solve_${name}.c LIBS lopside_solve)
endforeach()
lopside_unit_test(place_cases SOURCES test_place_cases.c test_place_brute.c LIBS lopside_solve)
lopside_unit_test(solve_coverage SOURCES test_solve_coverage.c solve_campaign.c
                  LIBS lopside_solve PkgConfig::LAPACKE LAPACK::LAPACK)
