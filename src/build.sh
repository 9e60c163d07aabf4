#!/usr/bin/env bash
# Configures and builds into build/ (further arguments go to CMake).
set -euo pipefail
root=$(cd "$(dirname "$0")/.." && pwd)
cmake -G Ninja -S "$root" -B "$root/build" "$@" >/dev/null
cmake --build "$root/build" -j "$(nproc)"
