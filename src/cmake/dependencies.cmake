# Every outside library is looked up here, and nowhere else.
find_package(Threads REQUIRED)
find_package(PkgConfig REQUIRED)
find_package(fmt REQUIRED)
find_package(tomlplusplus REQUIRED)
if(CMAKE_CXX_FLAGS MATCHES "fuzzer") # which must see the parser's own branches, and behaves as the library does
  set_property(TARGET tomlplusplus::tomlplusplus PROPERTY INTERFACE_COMPILE_OPTIONS
    "-DTOML_ASSERT(expr)=static_assert(true)" -fno-sanitize=unreachable)
endif()
find_package(nlohmann_json REQUIRED)
find_package(CLI11 REQUIRED)
find_package(OpenSSL REQUIRED COMPONENTS Crypto)
find_package(LibArchive REQUIRED)
if(TONEWALK_DEVELOPER_MODE)
  find_package(GTest REQUIRED)
endif()
pkg_check_modules(fftw3f REQUIRED IMPORTED_TARGET fftw3f)
pkg_check_modules(sndfile REQUIRED IMPORTED_TARGET sndfile)

# Libraries that ship no CMake package: a target each, headers checked.
function(tonewalk_plain_library name header library)
  find_path(${name}_INCLUDE ${header} REQUIRED)
  add_library(tonewalk_outside_${name} INTERFACE)
  target_include_directories(tonewalk_outside_${name} SYSTEM INTERFACE ${${name}_INCLUDE})
  if(library)
    find_library(${name}_LIBRARY ${library} REQUIRED)
    target_link_libraries(tonewalk_outside_${name} INTERFACE ${${name}_LIBRARY})
  endif()
endfunction()
tonewalk_plain_library(fftw3f_threads fftw3.h fftw3f_threads)
tonewalk_plain_library(csv csv.h csv)
tonewalk_plain_library(eigen eigen3/Eigen/Core "")
tonewalk_plain_library(boost_math boost/math/distributions/non_central_chi_squared.hpp "")

# What a program must link beside the static library (the rest is headers); tests/install notices one missing.
set(tonewalk_link_names fftw3f_threads fftw3f sndfile archive crypto tomlplusplus csv fmt)
