# unit tests of src/average
lopside_unit_test(circular SOURCES test_circular.c LIBS lopside_average)
lopside_unit_test(average_mean SOURCES test_average_mean.c LIBS lopside_average)
lopside_unit_test(average SOURCES test_average.c LIBS lopside_average)
lopside_unit_test(average_sweep SOURCES test_average_sweep.c LIBS lopside_average lopside_sim)
lopside_unit_test(average_unsteady SOURCES test_average_unsteady.c LIBS lopside_average lopside_sim)
