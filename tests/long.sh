#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-3.0-or-later
# Builds and runs the long forms of the statistical tests, one line per check with its figures
# (half an hour on one core). Ends with 0 when every check holds.
set -euo pipefail
root=$(cd "$(dirname "$0")/.." && pwd)
cmake -G Ninja -S "$root" -B "$root/build" >/dev/null
cmake --build "$root/build" -j "$(nproc)" --target method_tests run_tests
export KNEEPRINT_LONG=1
method=coverage_test.cpp,*efficiency_test.cpp,*monte_carlo_test.cpp,*numerical_floor_test.cpp
"$root/build/method_tests" --source-file="*$method"
"$root/build/run_tests" --source-file='*reel_scatter_test.cpp'
