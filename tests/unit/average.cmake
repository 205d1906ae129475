# unit tests of src/average
