# The everyday build: optimised for debugging, tests on.
set(CMAKE_BUILD_TYPE Debug CACHE STRING "")
set(CMAKE_C_FLAGS_DEBUG "-Og -g3" CACHE STRING "")
set(BALLAST_TESTS ON CACHE BOOL "")
