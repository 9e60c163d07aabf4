#!/usr/bin/env bash
# Installs what is missing, builds with warnings as errors, runs every test.
set -euo pipefail
root=$(cd "$(dirname "$0")/.." && pwd)
bash "$root/src/setup.sh"
bash "$root/src/build.sh" -DKNEEPRINT_WERROR=ON
echo "Results stand below; details in $root/build/Testing/Temporary/LastTest.log"
ctest --test-dir "$root/build" --output-on-failure -j "$(nproc)"
