# unit tests of src/sheet
