# tests/ mirrors src/: every tests/FOLDER/*_test.cpp goes into one doctest program of that folder, and
# every test case is registered with ctest once, by discovery.
include(doctest)

add_library(kneeprint_doctest_main STATIC tests/doctest_main.cpp)
target_link_libraries(kneeprint_doctest_main PUBLIC doctest::doctest)

foreach(folder quantity platform signal curve method sigmoid unit rig print figure report run)
  file(GLOB sources CONFIGURE_DEPENDS ${PROJECT_SOURCE_DIR}/tests/${folder}/*_test.cpp)
  if(sources)
    add_executable(${folder}_tests ${sources})
    target_include_directories(${folder}_tests PRIVATE ${PROJECT_SOURCE_DIR}/tests)
    target_link_libraries(${folder}_tests PRIVATE kneeprint_doctest_main kneeprint_${folder})
    target_compile_options(${folder}_tests PRIVATE ${KNEEPRINT_WARNINGS})
    doctest_discover_tests(${folder}_tests TEST_PREFIX "${folder}: ")
  endif()
endforeach()

# The sine fits of IEEE Std 1057 are written with it.
find_package(Eigen3 REQUIRED)
target_link_libraries(method_tests PRIVATE Eigen3::Eigen)

# Checks against sources outside the project: Python's standard library and SciPy, a real audio server,
# third-party processors. Each gets a fresh folder in the build tree.
find_program(KNEEPRINT_PYTHON NAMES python3 PATHS /usr/bin NO_DEFAULT_PATH REQUIRED)
file(GLOB reference_scripts CONFIGURE_DEPENDS ${PROJECT_SOURCE_DIR}/tests/reference/*.py)
list(FILTER reference_scripts EXCLUDE REGEX "kneeprint_tool")
foreach(script ${reference_scripts})
  get_filename_component(check ${script} NAME_WE)
  set(work ${PROJECT_BINARY_DIR}/reference/${check})
  add_test(NAME "reference: ${check}"
           COMMAND ${CMAKE_COMMAND} -DPYTHON=${KNEEPRINT_PYTHON} -DSCRIPT=${script}
                   -DTOOL=$<TARGET_FILE:kneeprint> -DWORK=${work}
                   -P ${PROJECT_SOURCE_DIR}/tests/run_reference.cmake)
  set_tests_properties("reference: ${check}" PROPERTIES TIMEOUT 900)
endforeach()
# A live server without realtime priority has the machine to itself.
set_tests_properties("reference: live_server" PROPERTIES RUN_SERIAL TRUE)

# Speed against two peers (tests/bench.sh). Built on demand alone: figures of time decide no test.
add_executable(kneeprint_bench EXCLUDE_FROM_ALL tests/bench/bench.cpp)
target_include_directories(kneeprint_bench PRIVATE ${PROJECT_SOURCE_DIR}/tests)
target_link_libraries(kneeprint_bench PRIVATE kneeprint_method)
target_compile_options(kneeprint_bench PRIVATE ${KNEEPRINT_WARNINGS})
add_executable(kneeprint_bench_peer EXCLUDE_FROM_ALL tests/bench/peer.c)
target_link_libraries(kneeprint_bench_peer PRIVATE PkgConfig::FFTW m)
target_compile_options(kneeprint_bench_peer PRIVATE -Wall -Wextra)
