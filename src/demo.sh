#!/usr/bin/env bash
# Installs what is missing, builds, measures the virtual triode stage, leaves reports/demo.
set -euo pipefail
root=$(cd "$(dirname "$0")/.." && pwd)
bash "$root/src/setup.sh"
bash "$root/src/build.sh"
rm -rf "$root/reports/demo"
"$root/build/kneeprint" measure --into "$root/reports/demo" --plan portrait --rig virtual:triode \
  --unit "Hollowmere VL-2 valve line stage, gain 3, serial 0117 (invented)" --seed 2026
echo "Done: open $root/reports/demo/report.html"
