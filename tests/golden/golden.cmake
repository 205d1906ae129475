# Runs `lopside report` on the hand-written streams beside this file and compares text and exit code.
#
# To renew the expected texts after a wanted change, run this and read every difference with your own eyes:
#     for k in balance refused unsolved trial audit nasty outcomes; do
#         BUILD/src/lopside report tests/golden/report-$k.jsonl > tests/golden/report-$k.txt; done
#     git diff tests/golden
# The numbers in the streams are invented: DE-V as found is 7.234 mm/s rms at a lag of 143.2 deg, written as the
# acceleration an accelerometer would see (a quarter turn earlier, times the angular speed); trial
# 5.020 at 170; NDE-H 3.117 at 251.6 and 2.61 at 228. The sheet counts with rotation.
# Outcomes: two planes (left 300 mm; right 200 mm, drilled). Unbalances of the parts 6000 g mm at 60 deg and 3000 g mm
# at 330 deg, hence 20 and 30 g, 10 and 15 g; drilled on the other side, and the couple turned by half a turn on the
# second plane. Their 95 % half widths follow from standard deviations of 1 and 2 g. Predicted: 1.00 mm/s rms at a lag
# of 90 deg (as acceleration: a quarter turn earlier) and 2.00 at 0; measured 1.50 at 180 and 2.00 at 90. All weights
# as one a plane: 22.3 g at 33 deg and 40 g at 270 deg make 33.55 g at 303.9 deg, by the cosine rule.
# +/- of readings: 1.96 standard deviations of `cov` along the vector; outcomes, NDE-H: 1.96*sqrt(5e-9)/sqrt(2) m/s
# = 0.098 mm/s rms.
# Trial: 0.5 m/s2 peak at 1480 rpm is 0.5/(2 pi 1480/60)/sqrt 2 = 2.28 mm/s rms.
#
# cmake -DLOPSIDE=program -DGOLDEN=folder -P golden.cmake
set(balance 0)
set(refused 4)
set(unsolved 5)
set(trial 0)
set(audit 3)
set(nasty 0)
set(outcomes 0)
foreach(name balance refused unsolved trial audit nasty outcomes)
  set(input "${GOLDEN}/report-${name}.jsonl")
  set(output "golden-report-${name}.txt")
  execute_process(COMMAND "${LOPSIDE}" report "${input}" OUTPUT_FILE "${output}" ERROR_VARIABLE said
                  RESULT_VARIABLE code)
  if(NOT code EQUAL ${name})
    message(SEND_ERROR "${name}: exit code ${code}, not ${${name}} (${said})")
  endif()
  execute_process(COMMAND "${CMAKE_COMMAND}" -E compare_files "${output}" "${GOLDEN}/report-${name}.txt"
                  RESULT_VARIABLE differs)
  if(differs)
    message(SEND_ERROR "${name}: the text is not the expected one: see ${output}")
  endif()
  foreach(form text csv json)
    # A stream without its end: exit 1, one line, and nothing on standard output.
    execute_process(COMMAND sh -c "sed '$d' \"$1\" | \"$2\" report --as $3" sh "${input}" "${LOPSIDE}" ${form}
                    OUTPUT_VARIABLE printed ERROR_VARIABLE said RESULT_VARIABLE code)
    if(NOT code EQUAL 1 OR NOT "${printed}" STREQUAL "" OR NOT said MATCHES "ended early")
      message(SEND_ERROR "${name}: cut stream as ${form}: exit code ${code}, '${printed}' (${said})")
    endif()
  endforeach()
endforeach()
foreach(arguments "--as;svg" "--as;svg;--what;readings" "--what;readings" "--as;csv;--what;nothing")
  execute_process(COMMAND "${LOPSIDE}" report ${arguments} "${GOLDEN}/report-balance.jsonl"
                  OUTPUT_VARIABLE printed ERROR_VARIABLE said RESULT_VARIABLE code)
  if(NOT code EQUAL 2 OR NOT "${printed}" STREQUAL "" OR NOT said MATCHES "^lopside report: [^\n]*\n$")
    message(SEND_ERROR "${arguments}: exit code ${code}, '${printed}' (${said})")
  endif()
endforeach()
