#!/bin/sh
# Installs, builds and runs every test: with gcc, with clang, and under the sanitizers. usage: sh cmake/test.sh
set -eu
cd "$(dirname "$0")/.."
sh cmake/install.sh build test
jobs=$(getconf _NPROCESSORS_ONLN)

build_and_test() { # name, initial cache, further words for cmake
    name=$1 cache=$2
    shift 2
    printf '\n== %s\n' "$name"
    cmake -C "cmake/$cache.cmake" -S . -B "build/$name" "$@" >/dev/null
    cmake --build "build/$name" -j "$jobs"
    ctest --test-dir "build/$name" -j "$jobs" --output-on-failure
}

shellcheck cmake/*.sh .ci/run
build_and_test test release -DBALLAST_TESTS=ON
build_and_test clang dev -DCMAKE_C_COMPILER=clang
build_and_test asan asan
printf '\nEvery test passed.\n'
