# Finds inih, which brings no CMake file. Defines Inih::Inih.
find_path(Inih_INCLUDE_DIR ini.h)
find_library(Inih_LIBRARY inih)
include(FindPackageHandleStandardArgs)
find_package_handle_standard_args(Inih REQUIRED_VARS Inih_LIBRARY Inih_INCLUDE_DIR)
if(Inih_FOUND AND NOT TARGET Inih::Inih)
  add_library(Inih::Inih UNKNOWN IMPORTED)
  set_target_properties(Inih::Inih PROPERTIES IMPORTED_LOCATION "${Inih_LIBRARY}"
                        INTERFACE_INCLUDE_DIRECTORIES "${Inih_INCLUDE_DIR}")
endif()
mark_as_advanced(Inih_INCLUDE_DIR Inih_LIBRARY)
