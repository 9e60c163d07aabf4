// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/tone_removal.h"

#include <doctest/doctest.h>

#include <cmath>
#include <numbers>
#include <random>
#include <vector>

using namespace kneeprint;

namespace {

constexpr double kTurn = 2.0 * std::numbers::pi;
const Hertz kRate(48000.0);

double rms(const std::vector<double>& x) {
  double sum = 0.0;
  for (const double v : x) sum += v * v;
  return std::sqrt(sum / static_cast<double>(x.size()));
}

// The tone of amplitude 1 with harmonics, under an envelope of time -1 .. 1.
template <class Envelope>
std::vector<double> tone_with(const CoherentTone& tone, int blocks, Envelope envelope) {
  std::vector<double> x(tone.block * static_cast<std::size_t>(blocks));
  for (std::size_t n = 0; n < x.size(); ++n) {
    const double angle = kTurn * tone.frequency.value() * static_cast<double>(n) / kRate.value();
    const double u = 2.0 * static_cast<double>(n) / static_cast<double>(x.size()) - 1.0;
    x[n] =
        envelope(u) * (std::cos(angle) + 0.1 * std::sin(2.0 * angle) - 0.01 * std::cos(3 * angle));
  }
  return x;
}

}  // namespace

TEST_CASE("a steady tone and its harmonics vanish") {
  const CoherentTone tone = coherent_tone(Hertz(997.0), kRate, Seconds(0.5), 10);
  auto x = tone_with(tone, 4, [](double) { return 1.0; });
  remove_tones(x, tone, 3);
  // Two passes that leave some 1e-4 each (1 / (pi cycles) and a little more for higher terms).
  CHECK(rms(x) < 5e-7);
}

TEST_CASE("a cubic envelope vanishes, an order beyond those asked stays") {
  const CoherentTone tone = coherent_tone(Hertz(997.0), kRate, Seconds(0.5), 10);
  const auto cubic = [](double u) { return 1.0 + 0.2 * u - 0.1 * u * u + 0.05 * u * u * u; };
  auto x = tone_with(tone, 4, cubic);
  remove_tones(x, tone, 3);
  CHECK(rms(x) < 5e-7);
  auto y = tone_with(tone, 4, [](double) { return 1.0; });
  remove_tones(y, tone, 2);
  CHECK(rms(y) == doctest::Approx(0.01 / std::sqrt(2.0)).epsilon(1e-6));
}

TEST_CASE("noise loses eight degrees of freedom per order") {
  const CoherentTone tone = coherent_tone(Hertz(997.0), kRate, Seconds(0.5), 10);
  std::mt19937_64 random(2);
  std::normal_distribution<double> noise;
  double lost = 0.0;
  constexpr int kRepeats = 40, kOrders = 5;
  for (int r = 0; r < kRepeats; ++r) {
    std::vector<double> x(2 * tone.block);
    for (double& v : x) v = noise(random);
    const double before = rms(x) * rms(x) * static_cast<double>(x.size());
    remove_tones(x, tone, kOrders);
    lost += before - rms(x) * rms(x) * static_cast<double>(x.size());
  }
  // Chi-square with 8 * 5 * 40 degrees of freedom: five standard deviations of sqrt(2 dof).
  constexpr double kDof = 8.0 * kOrders * kRepeats;
  CHECK(std::abs(lost - kDof) < 5.0 * std::sqrt(2.0 * kDof));
}
