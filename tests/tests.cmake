# SPDX-License-Identifier: Apache-2.0
# Every tests/{unit,checks,system}/test_NAME.c is one program: it defines
# `Suite *suite(void)`, tests/main.c runs it.  Tests run from the source tree
# and find data as "tests/data/...".
enable_testing()

function(check_tests folder)
  file(GLOB files CONFIGURE_DEPENDS tests/${folder}/test_*.c)
  foreach(file ${files})
    get_filename_component(name ${file} NAME_WE)
    add_executable(${name} ${file} tests/main.c)
    target_link_libraries(${name} PRIVATE toollib PkgConfig::CHECK ${MSGPACKC})
    target_compile_definitions(${name} PRIVATE
      TOOL_PATH="$<TARGET_FILE:ropewalk>" DAEMON_PATH="$<TARGET_FILE:ropewalkd>")
    add_dependencies(${name} ropewalk ropewalkd)
    add_test(NAME ${folder}.${name} COMMAND ${name}
             WORKING_DIRECTORY ${PROJECT_SOURCE_DIR})
    set_tests_properties(${folder}.${name} PROPERTIES TIMEOUT 300)
  endforeach()
endfunction()

check_tests(unit)
check_tests(checks)
check_tests(system)

file(GLOB bench_files CONFIGURE_DEPENDS tests/bench/bench_*.c)
foreach(file ${bench_files})
  get_filename_component(name ${file} NAME_WE)
  add_executable(${name} EXCLUDE_FROM_ALL ${file})
  target_link_libraries(${name} PRIVATE toollib)
  target_compile_options(${name} PRIVATE -O3)
endforeach()
