# find_package(tonewalk) gives the target tonewalk::tonewalk.
include(CMakeFindDependencyMacro)
find_dependency(Threads)
include(${CMAKE_CURRENT_LIST_DIR}/tonewalk-targets.cmake)
