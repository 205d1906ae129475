# What an installation has besides the program and its manual pages, and the Debian package made of it by `cpack`.
install(FILES scripts/completions/lopside.bash
        DESTINATION "${CMAKE_INSTALL_DATADIR}/bash-completion/completions" RENAME lopside)
install(CODE "execute_process(COMMAND \"\${CMAKE_COMMAND}\" -E create_symlink lopside
        \"\$ENV{DESTDIR}\${CMAKE_INSTALL_PREFIX}/${CMAKE_INSTALL_DATADIR}/bash-completion/completions/lopside-inbox\")")
# zsh looks into site-functions under /usr/local only; what packages bring has a folder of its own in Debian.
install(CODE "
  set(folder site-functions)
  if(CMAKE_INSTALL_PREFIX MATCHES \"/usr$\")
    set(folder vendor-completions)
  endif()
  file(INSTALL \"${PROJECT_SOURCE_DIR}/scripts/completions/_lopside\"
       DESTINATION \"\${CMAKE_INSTALL_PREFIX}/${CMAKE_INSTALL_DATADIR}/zsh/\${folder}\")")
install(FILES LICENSE DESTINATION "${CMAKE_INSTALL_DOCDIR}" RENAME copyright)
install(FILES README.md DESTINATION "${CMAKE_INSTALL_DOCDIR}")

set(CPACK_GENERATOR DEB)
set(CPACK_PACKAGE_NAME lopside)
set(CPACK_PACKAGE_VENDOR "Lopside maintainers")
set(CPACK_PACKAGE_CONTACT "Lopside maintainers <maintainers@lopside.invalid>")
set(CPACK_PACKAGE_DESCRIPTION_SUMMARY "vibration recordings to a balance weight, as a chain of stages in a pipe")
set(CPACK_PACKAGE_DESCRIPTION "Turns recordings of vibration channels and a once-per-turn tacho into the weight to
mount on a fan, pump, turbine or propeller, at a position that exists and from the
pieces at hand, with a forecast of what will be left; refuses readings that cannot
carry it; and audits recordings.")
set(CPACK_STRIP_FILES ON)
set(CPACK_VERBATIM_VARIABLES ON)
set(CPACK_DEBIAN_FILE_NAME DEB-DEFAULT)
set(CPACK_DEBIAN_PACKAGE_SECTION science)
# The libraries by what the program was linked with; all that lopside-inbox runs is essential in Debian.
set(CPACK_DEBIAN_PACKAGE_SHLIBDEPS ON)
set(CPACK_DEBIAN_PACKAGE_SUGGESTS "bash-completion, cron-daemon")
include(CPack)
