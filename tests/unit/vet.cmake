# unit tests of src/vet
