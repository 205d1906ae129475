# unit tests of src/solve
