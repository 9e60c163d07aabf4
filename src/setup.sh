#!/usr/bin/env bash
# Installs the Debian 12 packages that Kneeprint builds, tests and demonstrates with.
# Quick when nothing is missing; uses sudo only when not root.
set -euo pipefail

packages=(
  g++ cmake ninja-build pkg-config clang-format
  portaudio19-dev libfftw3-dev libsndfile1-dev
  libceres-dev libeigen3-dev libboost-dev libcairo2-dev zlib1g-dev
  nlohmann-json3-dev libcli11-dev libfmt-dev doctest-dev
  fonts-dejavu-core
  # what the tests check against
  python3 python3-scipy ngspice jackd2 ecasound swh-plugins sox ffmpeg
)

missing=()
for package in "${packages[@]}"; do
  dpkg-query -W -f='${Status}' "$package" 2>/dev/null | grep -q 'install ok installed' ||
    missing+=("$package")
done
[ ${#missing[@]} -eq 0 ] && exit 0

as_root=()
[ "$(id -u)" -eq 0 ] || as_root=(sudo)
echo "installing: ${missing[*]}"
export DEBIAN_FRONTEND=noninteractive
# jackd2 asks about realtime priority; the answer is no, since nothing here needs it.
echo "jackd2 jackd/tweak_rt_limits boolean false" | "${as_root[@]}" debconf-set-selections
"${as_root[@]}" apt-get update -qq
"${as_root[@]}" env DEBIAN_FRONTEND=noninteractive \
  apt-get install -y -qq --no-install-recommends "${missing[@]}" >/dev/null
