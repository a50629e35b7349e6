# Installation: program, library, headers, and what lets others find them (CMake package, pkg-config file).
include(CMakePackageConfigHelpers)

# Public headers include no outside library, so only who links the static library needs to link those as well.
get_target_property(library_type tonewalk TYPE)
get_target_property(in_tree tonewalk INTERFACE_LINK_LIBRARIES)
set(outside "")
if(library_type STREQUAL "STATIC_LIBRARY")
  set(outside ${tonewalk_link_names})
  list(TRANSFORM outside PREPEND "-l" OUTPUT_VARIABLE pkg_config_private)
  list(JOIN pkg_config_private " " pkg_config_private)
  list(APPEND outside Threads::Threads)
endif()
set_property(TARGET tonewalk PROPERTY INTERFACE_LINK_LIBRARIES
  "$<BUILD_INTERFACE:${in_tree}>" "$<INSTALL_INTERFACE:${outside}>")

if(library_type STREQUAL "SHARED_LIBRARY")
  file(RELATIVE_PATH bin_to_lib ${CMAKE_INSTALL_FULL_BINDIR} ${CMAKE_INSTALL_FULL_LIBDIR})
  set_target_properties(tonewalk_cli PROPERTIES INSTALL_RPATH "$ORIGIN/${bin_to_lib}")
endif()

set(package_folder ${CMAKE_INSTALL_LIBDIR}/cmake/tonewalk)
install(TARGETS tonewalk_cli)
install(TARGETS tonewalk EXPORT tonewalk-targets)
install(DIRECTORY include/tonewalk DESTINATION ${CMAKE_INSTALL_INCLUDEDIR} FILES_MATCHING PATTERN "*.hpp")
install(EXPORT tonewalk-targets NAMESPACE tonewalk:: DESTINATION ${package_folder})
write_basic_package_version_file(${PROJECT_BINARY_DIR}/tonewalk-config-version.cmake
  COMPATIBILITY SameMinorVersion)
install(FILES ${CMAKE_CURRENT_LIST_DIR}/tonewalk-config.cmake
  ${PROJECT_BINARY_DIR}/tonewalk-config-version.cmake DESTINATION ${package_folder})

# The prefix is told from where the file lies, so that `cmake --install --prefix` may choose it.
set(pkg_config_folder ${CMAKE_INSTALL_LIBDIR}/pkgconfig)
file(RELATIVE_PATH pkg_config_to_prefix ${CMAKE_INSTALL_FULL_LIBDIR}/pkgconfig ${CMAKE_INSTALL_PREFIX})
configure_file(${CMAKE_CURRENT_LIST_DIR}/tonewalk.pc.in ${PROJECT_BINARY_DIR}/tonewalk.pc @ONLY)
install(FILES ${PROJECT_BINARY_DIR}/tonewalk.pc DESTINATION ${pkg_config_folder})
install(FILES LICENSE README.md TYPE DOC)
install(DIRECTORY docs TYPE DOC)

if(TARGET tonewalk_pages)
  set(pages ${PROJECT_BINARY_DIR}/src/cli)
  install(FILES ${pages}/tonewalk.1 DESTINATION ${CMAKE_INSTALL_MANDIR}/man1)
  install(FILES ${pages}/tonewalk.bash DESTINATION ${CMAKE_INSTALL_DATADIR}/bash-completion/completions RENAME tonewalk)
  install(FILES ${pages}/_tonewalk DESTINATION ${CMAKE_INSTALL_DATADIR}/zsh/site-functions)
  install(FILES ${pages}/tonewalk.fish DESTINATION ${CMAKE_INSTALL_DATADIR}/fish/vendor_completions.d)
endif()
