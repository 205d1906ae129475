# unit tests of src/track
foreach(test kernels edge tracker tachos shape tone marks teeth stray fuzz)
  lopside_unit_test(track_${test} SOURCES test_track_${test}.c LIBS lopside_track)
endforeach()
# the acceptance table judges the readings that average makes of the blocks, too
lopside_unit_test(track_table SOURCES test_track_table.c LIBS lopside_track lopside_average)
