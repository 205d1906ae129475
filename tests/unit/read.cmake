# unit tests of src/read
