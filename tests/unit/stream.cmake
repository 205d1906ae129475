# unit tests of src/stream
lopside_unit_test(stream SOURCES test_stream.c LIBS lopside_stream)
