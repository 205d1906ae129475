# unit tests of src/read
foreach(kernel decimal digest even names audio csv lanes)
  lopside_unit_test(read_${kernel} SOURCES test_read_${kernel}.c LIBS lopside_read)
endforeach()
