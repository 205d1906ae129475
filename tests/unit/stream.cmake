# unit tests of src/stream
