#!/usr/bin/env bash
# Kneeprint's speed against numpy, scipy and plain C with FFTW on the same takes, and `kneeprint analyse` on
# growing folders: ratios, everything in one run (some ten minutes; measuring FFTW's plan for a sweep takes most of
# them the first time). Not a test: it always ends well when it could run.
set -euo pipefail
root=$(cd "$(dirname "$0")/.." && pwd)
cmake -G Ninja -S "$root" -B "$root/build" >/dev/null
cmake --build "$root/build" -j "$(nproc)" --target kneeprint kneeprint_bench kneeprint_bench_peer >/dev/null
mkdir -p "$root/build/bench"
/usr/bin/python3 -B "$root/tests/bench/run.py" "$root/build" "$root/build/bench"
