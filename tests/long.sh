#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-3.0-or-later
# The long forms of the statistical tests (some minutes), one line per check with its figures.
set -euo pipefail
root=$(cd "$(dirname "$0")/.." && pwd)
cmake -G Ninja -S "$root" -B "$root/build" >/dev/null
cmake --build "$root/build" -j "$(nproc)" --target method_tests
KNEEPRINT_LONG=1 "$root/build/method_tests" \
  --source-file='*coverage_test.cpp,*efficiency_test.cpp,*monte_carlo_test.cpp,*numerical_floor_test.cpp' "$@"
