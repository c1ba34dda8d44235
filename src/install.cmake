# SPDX-License-Identifier: GPL-2.0-or-later
# What `cmake --install` leaves: the command, the library, the public headers with those they include, and the package
# files by which another CMake project finds foreglow::foreglow.
include(CMakePackageConfigHelpers)

set(package_dir ${CMAKE_INSTALL_LIBDIR}/cmake/foreglow)

install(TARGETS foreglow_core EXPORT foreglow-targets ARCHIVE DESTINATION ${CMAKE_INSTALL_LIBDIR})
install(EXPORT foreglow-targets NAMESPACE foreglow:: DESTINATION ${package_dir})

# api/*.h and, one after the other, every "room/file.h" that they include.
file(GLOB waiting CONFIGURE_DEPENDS RELATIVE "${CMAKE_CURRENT_SOURCE_DIR}" "${CMAKE_CURRENT_SOURCE_DIR}/api/*.h")
set(public_headers ${waiting})
while(waiting)
  list(POP_FRONT waiting header)
  set_property(DIRECTORY APPEND PROPERTY CMAKE_CONFIGURE_DEPENDS "${CMAKE_CURRENT_SOURCE_DIR}/${header}")
  file(STRINGS "${CMAKE_CURRENT_SOURCE_DIR}/${header}" include_lines REGEX "^#include \"[a-z]+/[a-z_0-9]+\\.h\"")
  foreach(line IN LISTS include_lines)
    string(REGEX REPLACE "^#include \"([^\"]+)\".*" "\\1" included "${line}")
    if(NOT included IN_LIST public_headers)
      list(APPEND public_headers ${included})
      list(APPEND waiting ${included})
    endif()
  endforeach()
endwhile()
foreach(header IN LISTS public_headers)
  get_filename_component(room "${header}" DIRECTORY)
  install(FILES ${header} DESTINATION ${CMAKE_INSTALL_INCLUDEDIR}/foreglow/${room})
endforeach()

configure_package_config_file(foreglow-config.cmake.in "${PROJECT_BINARY_DIR}/generated/foreglow-config.cmake"
  INSTALL_DESTINATION ${package_dir})
write_basic_package_version_file("${PROJECT_BINARY_DIR}/generated/foreglow-config-version.cmake"
  COMPATIBILITY SameMinorVersion)
install(FILES "${PROJECT_BINARY_DIR}/generated/foreglow-config.cmake"
  "${PROJECT_BINARY_DIR}/generated/foreglow-config-version.cmake" DESTINATION ${package_dir})
install(FILES "${PROJECT_SOURCE_DIR}/LICENSE" DESTINATION ${CMAKE_INSTALL_DOCDIR})
