# unit tests of src/track
foreach(test kernels tracker tachos shape tone marks)
  lopside_unit_test(track_${test} SOURCES test_track_${test}.c LIBS lopside_track)
endforeach()
