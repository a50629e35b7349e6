# A room is one object library, tonewalk_ROOM, made of every .cpp in src/ROOM. It links only rooms
# above it in the table of docs/architecture.md; tests/house/rooms_test.py holds the includes to that.
add_library(tonewalk_options INTERFACE)
target_compile_features(tonewalk_options INTERFACE cxx_std_20)
target_compile_options(tonewalk_options INTERFACE -ffp-contract=off)
target_include_directories(tonewalk_options INTERFACE
  $<BUILD_INTERFACE:${PROJECT_SOURCE_DIR}/include>)
if(TONEWALK_DEVELOPER_MODE)
  target_compile_options(tonewalk_options INTERFACE
    -Wall -Wextra -Wpedantic -Wshadow -Wnon-virtual-dtor -Wold-style-cast -Wcast-align
    -Woverloaded-virtual -Wconversion -Wsign-conversion -Wdouble-promotion)
  if(NOT CMAKE_CXX_FLAGS MATCHES "-fsanitize") # whose instrumentation makes GCC warn of what is not there
    target_compile_options(tonewalk_options INTERFACE -Werror)
  endif()
  if(CMAKE_UNITY_BUILD) # a file's own names are no secret from the ones behind it
    target_compile_options(tonewalk_options INTERFACE -Wno-shadow)
  endif()
endif()

set_property(GLOBAL PROPERTY tonewalk_rooms "")

# tonewalk_room(NAME ROOMS room... OUTSIDE target...)
function(tonewalk_room name)
  cmake_parse_arguments(arg "" "" "ROOMS;OUTSIDE" ${ARGN})
  file(GLOB sources CONFIGURE_DEPENDS ${CMAKE_CURRENT_SOURCE_DIR}/*.cpp)
  if(NOT sources)  # a room that is still being furnished
    set(sources ${CMAKE_CURRENT_BINARY_DIR}/empty.cpp)
    file(TOUCH ${sources})
  endif()
  add_library(tonewalk_${name} OBJECT ${sources})
  set_target_properties(tonewalk_${name} PROPERTIES POSITION_INDEPENDENT_CODE ON)
  target_include_directories(tonewalk_${name} PRIVATE ${CMAKE_CURRENT_SOURCE_DIR})
  target_link_libraries(tonewalk_${name} PUBLIC tonewalk_options PRIVATE ${arg_OUTSIDE})
  set_property(TARGET tonewalk_${name} PROPERTY tonewalk_room_outside "${arg_OUTSIDE}")
  set(above "")
  foreach(room IN LISTS arg_ROOMS)
    get_property(higher TARGET tonewalk_${room} PROPERTY tonewalk_room_above)
    list(APPEND above ${higher} ${room})
  endforeach()
  list(REMOVE_DUPLICATES above)
  set_property(TARGET tonewalk_${name} PROPERTY tonewalk_room_above "${above}")
  set_property(GLOBAL APPEND PROPERTY tonewalk_rooms ${name})
endfunction()

# tonewalk_link_rooms(TARGET room...): the objects of these rooms and of all rooms above them.
function(tonewalk_link_rooms target)
  set(all "")
  foreach(room IN LISTS ARGN)
    get_property(above TARGET tonewalk_${room} PROPERTY tonewalk_room_above)
    list(APPEND all ${above} ${room})
  endforeach()
  list(REMOVE_DUPLICATES all)
  foreach(room IN LISTS all)
    get_property(outside TARGET tonewalk_${room} PROPERTY tonewalk_room_outside)
    target_link_libraries(${target} PRIVATE tonewalk_${room} ${outside})
    target_sources(${target} PRIVATE $<TARGET_OBJECTS:tonewalk_${room}>)
  endforeach()
  target_link_libraries(${target} PRIVATE tonewalk_options)
endfunction()

# What every test program has. GoogleTest's header is compiled once for all of them.
if(TONEWALK_DEVELOPER_MODE)
  include(GoogleTest)
  file(CONFIGURE OUTPUT ${PROJECT_BINARY_DIR}/gtest_header.cpp CONTENT "// the header alone\n")
  add_library(tonewalk_gtest OBJECT ${PROJECT_BINARY_DIR}/gtest_header.cpp)
  target_link_libraries(tonewalk_gtest PUBLIC tonewalk_options GTest::gtest_main)
  target_include_directories(tonewalk_gtest PUBLIC ${PROJECT_SOURCE_DIR}/tests)
  target_compile_definitions(tonewalk_gtest PUBLIC
    TONEWALK_TEST_DATA="${PROJECT_SOURCE_DIR}/tests/data"
    TONEWALK_TEST_PYTHON="/usr/bin/python3"
    TONEWALK_TEST_SUPPORT="${PROJECT_SOURCE_DIR}/tests/support")
  target_precompile_headers(tonewalk_gtest PRIVATE <gtest/gtest.h>)
endif()

# tonewalk_test_program(NAME source...): an executable of tests. The start of a suite's name is its label:
# Outside*, Coverage*, Slow*, Malformed*, Golden*; else unit.
function(tonewalk_test_program name)
  add_executable(tonewalk_${name}_tests ${ARGN})
  set_target_properties(tonewalk_${name}_tests PROPERTIES
    UNITY_BUILD OFF  # each test file has names of its own
    RUNTIME_OUTPUT_DIRECTORY ${PROJECT_BINARY_DIR}/tests)
  target_link_libraries(tonewalk_${name}_tests PRIVATE tonewalk_gtest)
  target_precompile_headers(tonewalk_${name}_tests REUSE_FROM tonewalk_gtest)
  set(special Outside Coverage Slow Malformed Golden)
  list(JOIN special "*:" others)
  gtest_discover_tests(tonewalk_${name}_tests TEST_PREFIX "${name}." TEST_FILTER "-${others}*"
    DISCOVERY_TIMEOUT 60 PROPERTIES LABELS unit)
  foreach(kind IN LISTS special)
    string(TOLOWER ${kind} label)
    set(cost 0)
    if(kind STREQUAL Coverage)
      set(cost 1000)  # the longest ones: first, so that none runs on alone at the end
    endif()
    gtest_discover_tests(tonewalk_${name}_tests TEST_PREFIX "${name}." TEST_FILTER "${kind}*"
      DISCOVERY_TIMEOUT 60 TEST_LIST ${name}_${label} PROPERTIES LABELS ${label} TIMEOUT 1800 COST ${cost})
  endforeach()
endfunction()

# tonewalk_room_tests(NAME [ROOMS room...]): one program of every *_test.cpp in tests/NAME.
function(tonewalk_room_tests name)
  cmake_parse_arguments(arg "" "" "ROOMS" ${ARGN})
  file(GLOB sources CONFIGURE_DEPENDS ${CMAKE_CURRENT_SOURCE_DIR}/${name}/*_test.cpp)
  tonewalk_test_program(${name} ${sources})
  tonewalk_link_rooms(tonewalk_${name}_tests ${name} ${arg_ROOMS})
endfunction()
