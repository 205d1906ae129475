# unit tests of src/sheet
lopside_unit_test(units SOURCES test_units.c LIBS lopside_sheet)
lopside_unit_test(sheet SOURCES test_sheet.c sheet_desk.c LIBS lopside_sheet)
lopside_unit_test(sheet_errors SOURCES test_sheet_errors.c sheet_desk.c LIBS lopside_sheet)
lopside_unit_test(sheet_text SOURCES test_sheet_text.c sheet_desk.c LIBS lopside_sheet)
