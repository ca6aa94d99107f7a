# Address and undefined-behaviour sanitizers, tests on.
set(CMAKE_BUILD_TYPE Debug CACHE STRING "")
set(CMAKE_C_FLAGS_DEBUG "-O1 -g" CACHE STRING "")
set(BALLAST_SANITIZE "address,undefined" CACHE STRING "")
set(BALLAST_TESTS ON CACHE BOOL "")
