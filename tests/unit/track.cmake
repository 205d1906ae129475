# unit tests of src/track
lopside_unit_test(track_tracker SOURCES test_track_tracker.c LIBS lopside_track)
