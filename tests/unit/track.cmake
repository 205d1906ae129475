# unit tests of src/track
