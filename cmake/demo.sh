#!/bin/sh
# Installs, builds, fits the demo network to its table, and shows what came out. usage: sh cmake/demo.sh
set -eu
cd "$(dirname "$0")/.."
sh cmake/install.sh build
cmake -C cmake/release.cmake -S . -B build/release -DBALLAST_TESTS=OFF >build-demo.log 2>&1 || { cat build-demo.log; exit 1; }
cmake --build build/release -j "$(getconf _NPROCESSORS_ONLN)" >>build-demo.log 2>&1 || { cat build-demo.log; exit 1; }
mv build-demo.log build/release/build.log
ballast=build/release/ballast
out=build/demo
mkdir -p "$out"
run() {
    printf '\n$ ballast %s\n' "$*"
    "$ballast" "$@"
}
run check networks/clinic.xml networks/cases.csv
run fit networks/clinic.xml networks/cases.csv -o "$out/fitted.xml" --json "$out/fit.json"
printf '\nThe first rows of Fever, as the JSON has them:\n'
sed -n '/"variable": "Fever"/,/"data_share"/p' "$out/fit.json"
printf '\nThe program is %s; the fitted network is %s/fitted.xml.\n' "$ballast" "$out"
