// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/chain_check.h"

#include <doctest/doctest.h>

#include <cmath>
#include <random>

#include "quantity/failure.h"

using namespace kneeprint;

namespace {

const Hertz kRate{48000.0};

Waveform returned(const Waveform& sent, std::size_t delay, double gain, double noise) {
  Waveform w{kRate, std::vector<double>(sent.samples.size() + 48000, 0.0)};
  std::mt19937_64 random(11);
  std::normal_distribution<double> n(0.0, 1.0);
  for (double& x : w.samples) x = noise * n(random);
  for (std::size_t i = 0; i < sent.samples.size(); ++i) {
    w.samples[i + delay] += gain * std::tanh(2.0 * sent.samples[i]) / 2.0;
  }
  return w;
}

}  // namespace

TEST_CASE("delay, gain and polarity come out") {
  const Waveform sent = chain_check_stimulus(kRate, LevelDbfs(-40.0));
  const ChainCheck check = judge_chain(sent, {returned(sent, 1473, -0.5, 1e-6)});
  CHECK(check.delay == doctest::Approx(1473.0).epsilon(1e-6));
  CHECK(check.polarity == -1);
  CHECK(check.gain.value() == doctest::Approx(-6.02).epsilon(0.01));
}

TEST_CASE("the reference's delay counts when there is one") {
  const Waveform sent = chain_check_stimulus(kRate, LevelDbfs(-40.0));
  const ChainCheck check =
      judge_chain(sent, {returned(sent, 1500, 0.5, 1e-6), returned(sent, 1473, 1.0, 1e-6)});
  CHECK(check.delay == doctest::Approx(1473.0).epsilon(1e-6));
}

TEST_CASE("no return, another signal, clipping and a missing reference are told apart") {
  const Waveform sent = chain_check_stimulus(kRate, LevelDbfs(-40.0));
  CHECK_THROWS_AS(judge_chain(sent, {returned(sent, 100, 0.0, 0.0)}), NothingUsable);
  CHECK_THROWS_AS(judge_chain(sent, {returned(sent, 100, 0.0, 1e-3)}), NothingUsable);
  CHECK_THROWS_AS(
      judge_chain(sent, {returned(sent, 100, 0.5, 1e-6), returned(sent, 100, 0.0, 1e-4)}),
      NothingUsable);
  Waveform hot = returned(sent, 100, 0.5, 0.0);
  hot.samples[500] = 1.0;
  CHECK_THROWS_AS(judge_chain(sent, {hot}), GuardStop);
}

TEST_CASE("the check stays quiet") {
  CHECK(chain_check_level(LevelDbfs(-10.0), LevelDbfs(0.0)) <= LevelDbfs(-40.0));
  CHECK(chain_check_level(LevelDbfs(-60.0), LevelDbfs(-50.0)) <= LevelDbfs(-50.0));
  const Waveform w = chain_check_stimulus(kRate, LevelDbfs(-40.0));
  for (const double x : w.samples) CHECK(std::abs(x) <= 0.01 + 1e-12);
}
