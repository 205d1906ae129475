# unit tests of src/report
set(golden "${PROJECT_SOURCE_DIR}/tests/golden")
lopside_unit_test(report_kernels SOURCES test_report_kernels.c LIBS lopside_report)
lopside_unit_test(report_dossier SOURCES test_report_dossier.c LIBS lopside_report)
target_compile_definitions(test_report_dossier PRIVATE "GOLDEN=\"${golden}\"")
lopside_unit_test(report_text SOURCES test_report_text.c LIBS lopside_report)
target_compile_definitions(test_report_text PRIVATE "GOLDEN=\"${golden}\"")
add_test(NAME unit/report_golden
         COMMAND "${CMAKE_COMMAND}" "-DLOPSIDE=$<TARGET_FILE:lopside>" "-DGOLDEN=${golden}"
                 -P "${golden}/golden.cmake")
