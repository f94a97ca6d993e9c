# SPDX-License-Identifier: Apache-2.0
# Every tests/{unit,checks,system}/test_NAME.c is one program: it defines
# `Suite *suite(void)`, tests/main.c runs it.  Tests run from the source tree
# and find data as "tests/data/...".
enable_testing()

file(GLOB support_sources CONFIGURE_DEPENDS tests/support/*.c)
add_library(support STATIC ${support_sources})
target_link_libraries(support PUBLIC toollib PkgConfig::CHECK)
target_compile_definitions(support PUBLIC
  TOOL_PATH="$<TARGET_FILE:ropewalk>" DAEMON_PATH="$<TARGET_FILE:ropewalkd>")

function(check_tests folder)
  file(GLOB files CONFIGURE_DEPENDS tests/${folder}/test_*.c)
  foreach(file ${files})
    get_filename_component(name ${file} NAME_WE)
    add_executable(${name} ${file} tests/main.c)
    target_link_libraries(${name} PRIVATE support toollib PkgConfig::CHECK
                          ${MSGPACKC})
    add_dependencies(${name} ropewalk ropewalkd)
    add_test(NAME ${folder}.${name} COMMAND ${name}
             WORKING_DIRECTORY ${PROJECT_SOURCE_DIR})
    set_tests_properties(${folder}.${name} PROPERTIES
      TIMEOUT $<IF:$<BOOL:${SANITIZE}>,1800,300>)
  endforeach()
endfunction()

check_tests(unit)
check_tests(checks)
check_tests(system)
if(TARGET test_pcap)
  target_link_libraries(test_pcap PRIVATE pcap)
endif()

file(GLOB bench_files CONFIGURE_DEPENDS tests/bench/bench_*.c)
foreach(file ${bench_files})
  get_filename_component(name ${file} NAME_WE)
  add_executable(${name} EXCLUDE_FROM_ALL ${file})
  target_link_libraries(${name} PRIVATE toollib)
  target_compile_options(${name} PRIVATE -O3)
endforeach()

# The counting shim of test_engine.
target_link_options(test_engine PRIVATE
  -Wl,--wrap=malloc -Wl,--wrap=calloc -Wl,--wrap=realloc)

# Fuzz targets: with -DFUZZ=ON (clang) they look by themselves, otherwise each
# is a test that goes through its corpus.
option(FUZZ "Link fuzz targets with libFuzzer" OFF)
file(GLOB fuzz_files CONFIGURE_DEPENDS tests/fuzz/fuzz_*.c)
if(FUZZ)
  foreach(lib math model filter engine wire run config)
    target_compile_options(${lib} PRIVATE -fsanitize=fuzzer-no-link)
  endforeach()
endif()
foreach(file ${fuzz_files})
  get_filename_component(name ${file} NAME_WE)
  string(REPLACE "fuzz_" "" short ${name})
  if(FUZZ)
    add_executable(${name} EXCLUDE_FROM_ALL ${file})
    target_compile_options(${name} PRIVATE -fsanitize=fuzzer)
    target_link_options(${name} PRIVATE -fsanitize=fuzzer)
  else()
    add_executable(${name} ${file} tests/fuzz/replay_main.c)
    add_test(NAME fuzz.${short}
             COMMAND ${name} tests/fuzz/corpus/${short}
             WORKING_DIRECTORY ${PROJECT_SOURCE_DIR})
  endif()
  target_link_libraries(${name} PRIVATE toollib)
endforeach()

# Arrows between folders run one way; core calls nothing but memory and string
# functions and sqrt.  A sanitizer adds symbols of its own.
if(SANITIZE)
  add_test(NAME style.layering COMMAND tests/layering.sh
           WORKING_DIRECTORY ${PROJECT_SOURCE_DIR})
else()
  add_test(NAME style.layering COMMAND tests/layering.sh
           $<TARGET_FILE:math> $<TARGET_FILE:model> $<TARGET_FILE:filter>
           $<TARGET_FILE:engine>
           WORKING_DIRECTORY ${PROJECT_SOURCE_DIR})
endif()

add_test(NAME style.files COMMAND tests/files.sh
         WORKING_DIRECTORY ${PROJECT_SOURCE_DIR})

# One hash for gcc and clang, -O0 and -O3.
if(NOT SANITIZE)
  add_test(NAME golden.builds COMMAND tests/golden.sh
           WORKING_DIRECTORY ${PROJECT_SOURCE_DIR})
  set_tests_properties(golden.builds PROPERTIES TIMEOUT 1200
                       ENVIRONMENT "GOLDEN_DIR=${PROJECT_BINARY_DIR}/golden")
endif()
