// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/settling.h"

#include <doctest/doctest.h>

#include <cmath>
#include <random>
#include <vector>

using namespace kneeprint;

namespace {

std::vector<double> decay(double step_db, double tau_s, int blocks, double block_s) {
  std::vector<double> y;
  for (int k = 0; k < blocks; ++k) y.push_back(-20.0 + step_db * std::exp(-k * block_s / tau_s));
  return y;
}

Settled judge(const std::vector<double>& y, double sigma, int keep, double longest_s) {
  const BlockTrend trend{y, sigma};
  return find_settled({&trend, 1}, static_cast<int>(y.size()), keep, Seconds(0.5),
                      Seconds(longest_s), Decibels(0.01));
}

}  // namespace

TEST_CASE("a unit without memory is settled from the first block") {
  const Settled s = judge(std::vector<double>(5, -20.0), 1e-4, 4, 30.0);
  CHECK(s.settled);
  CHECK(s.first == 0);
}

TEST_CASE("a fast decay costs its first blocks and no more") {
  // 1 dB falling with 0.2 s: e^(-0.5/0.2) = 0.082 per block.
  const Settled s = judge(decay(1.0, 0.2, 10, 0.5), 1e-5, 4, 2.0);
  CHECK(s.settled);
  CHECK(s.first >= 1);
  CHECK(s.first <= 2);
}

TEST_CASE("a 20 s time constant does not pass because neighbours agree") {
  // 0.5 dB over 20 s: neighbouring blocks differ by only 0.012 dB.
  const Settled s = judge(decay(0.5, 20.0, 8, 0.5), 1e-5, 4, 30.0);
  CHECK_FALSE(s.settled);
  CHECK(s.first == 4);
}

TEST_CASE("noise alone is rarely called unsettled") {
  std::mt19937_64 random(7);
  std::normal_distribution<double> noise(0.0, 0.02);
  int unsettled = 0;
  for (int run = 0; run < 1000; ++run) {
    std::vector<double> y(5);
    for (double& v : y) v = noise(random);
    unsettled += !judge(y, 0.02, 4, 0.5).settled;
  }
  // Two windows are tried at three standard uncertainties: well under 2 % of 1000, binomial bound
  // at 0.1 % for p = 0.01 is 20.
  CHECK(unsettled <= 20);
}
