# unit tests of src/report
