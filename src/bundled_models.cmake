# SPDX-License-Identifier: GPL-2.0-or-later
# Builds every models/*.toml into the library, so that the command needs no files beside it.
file(GLOB bundled_files CONFIGURE_DEPENDS "${PROJECT_SOURCE_DIR}/models/*.toml")
list(SORT bundled_files)
set(bundled_entries "")
foreach(bundled_file IN LISTS bundled_files)
  get_filename_component(bundled_name "${bundled_file}" NAME_WLE)
  file(READ "${bundled_file}" bundled_text)
  string(APPEND bundled_entries "    {\"${bundled_name}\", R\"toml(${bundled_text})toml\"},\n")
  set_property(DIRECTORY APPEND PROPERTY CMAKE_CONFIGURE_DEPENDS "${bundled_file}")
endforeach()
list(LENGTH bundled_files bundled_count)
configure_file("${CMAKE_CURRENT_SOURCE_DIR}/model/bundled_models_table.cpp.in"
  "${PROJECT_BINARY_DIR}/generated/bundled_models_table.cpp" @ONLY)
target_sources(room_model PRIVATE "${PROJECT_BINARY_DIR}/generated/bundled_models_table.cpp")
