// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/noise_power.h"

#include <doctest/doctest.h>

#include <boost/math/distributions/binomial.hpp>
#include <cmath>
#include <functional>
#include <numbers>
#include <random>

#include "method/hum.h"
#include "method/noise_synthetic.h"
#include "method/reading.h"

using namespace kneeprint;
using kneeprint::testing::covers;
using kneeprint::testing::fewest;
using kneeprint::testing::kNoiseRate;
using kneeprint::testing::most;
using kneeprint::testing::NoiseMaker;

namespace {

constexpr double kTurn = 2.0 * std::numbers::pi;
const Hertz kLow(20.0), kHigh(1800.0);

double white(double) { return 1.0; }
double pink(double f) { return 100.0 / f; }

// Power from 20 Hz to 1.8 kHz of a shape, weighted, by the midpoint rule; bins of 0.2 Hz as the
// maker's.
double true_power(const std::function<double(double)>& shape, Weighting weighting) {
  double sum = 0.0;
  constexpr double kStep = 0.1;
  for (double f = kLow.value() + kStep / 2; f < kHigh.value(); f += kStep) {
    sum += shape(f) * std::norm(weighting(Hertz(f))) * kStep;
  }
  return sum;
}

}  // namespace

TEST_CASE("density, level under lines and effective segments of white noise") {
  NoiseMaker make(3);
  const Waveform w = make.noise(white, 20.0);
  const NoiseSpectrum s(w, Seconds(1.0));
  CHECK(s.segments() == 39);
  CHECK(s.bin_hz() == doctest::Approx(1.0));
  double sum = 0.0;
  for (std::size_t k = 100; k < 1900; ++k) sum += s.density(k) / 1800.0;
  // 1800 Hz over 20 s: 1 / sqrt(B T) = 0.5 %; five of them.
  CHECK(std::abs(sum - 1.0) < 0.027);
  double medians = 0.0;
  for (std::size_t k = 100; k < 1900; k += 50) medians += s.around(k, 3, 22).density / 36.0;
  // Unbiased: 36 medians of 40 bins with 38 segments, standard deviation
  // 1 / sqrt(36 * dof / 2).
  const double sigma = 1.0 / std::sqrt(36.0 * s.around(1000, 3, 22).dof / 2.0);
  CHECK(std::abs(medians - 1.0) < 5.0 * sigma);
}

namespace {

struct Kind {
  std::function<double(double)> shape;
  Weighting weighting;
  double hum_peak;
};
constexpr double kHumHz = 151.3;

// Six seconds of it, of which the outer halves are soft ends, read as the silence method does.
Uncertain power_of(const Kind& kind, NoiseMaker& make) {
  Waveform w = make.noise(kind.shape, 6.0);
  const double phase = make.phase();
  for (std::size_t n = 0; n < w.samples.size(); ++n) {
    const double t = static_cast<double>(n) / kNoiseRate.value();
    w.samples[n] += kind.hum_peak * std::cos(kTurn * kHumHz * t + phase);
  }
  const std::size_t soft = samples_in(Seconds(0.5), kNoiseRate);
  const Waveform state{
      w.rate,
      {w.samples.begin() + static_cast<long>(soft), w.samples.end() - static_cast<long>(soft)}};
  for (std::size_t n = 0; n < soft; ++n) {
    const double turn = (static_cast<double>(n) + 0.5) / static_cast<double>(soft) / 2.0;
    const double rise = 0.5 - 0.5 * std::cos(kTurn * turn);
    w.samples[n] *= rise;
    w.samples[w.samples.size() - 1 - n] *= rise;
  }
  const Waveform y = weighted(w, kind.weighting, kLow, kHigh);
  const std::span inner(y.samples.data() + soft, state.samples.size());
  const NoiseSpectrum spectrum(state, Seconds(1.0));
  return mean_power(block_powers(inner, 10),
                    gaussian_power_u(spectrum, kind.weighting, kLow, kHigh, Seconds(5.0)));
}

void check_coverage(const std::vector<Kind>& kinds, unsigned seed) {
  constexpr int kRepeats = 150;
  NoiseMaker make(seed);
  int index = 0;
  for (const Kind& kind : kinds) {
    CAPTURE(index);
    const double truth =
        true_power(kind.shape, kind.weighting) +
        0.5 * kind.hum_peak * kind.hum_peak * std::norm(kind.weighting(Hertz(kHumHz)));
    int covered = 0;
    for (int r = 0; r < kRepeats; ++r) covered += covers(power_of(kind, make), truth);
    // Five kinds, two sides: 0.1 % for all of them.
    CHECK(covered >= fewest(kRepeats, 0.95, 0.001 / 10));
    CHECK(covered <= most(kRepeats, 0.95, 0.001 / 10));
    ++index;
  }
}

}  // namespace

TEST_CASE("intervals of weighted noise cover its power: white") {
  check_coverage(
      {{white, flat_weighting, 0.0}, {white, a_weighting, 0.0}, {white, flat_weighting, 20.0}}, 17);
}

TEST_CASE("intervals of weighted noise cover its power: 1/f, and with hum") {
  check_coverage({{pink, flat_weighting, 0.0}, {pink, a_weighting, 20.0}}, 18);
}

TEST_CASE("noise that comes and goes has the uncertainty of its scatter") {
  const std::vector<double> steady = {1.01, 0.99, 1.0, 1.02, 0.98},
                            wild = {1.0, 3.0, 0.2, 2.0, 0.1};
  CHECK(mean_power(steady, 0.01).u == 0.01);
  CHECK(std::isinf(mean_power(steady, 0.01).dof));
  const Uncertain w = mean_power(wild, 0.01);
  // Mean 1.26, squared deviations 6.112, / 4 / 5.
  CHECK(w.value == doctest::Approx(1.26));
  CHECK(w.u == doctest::Approx(std::sqrt(6.112 / 20.0)));
  CHECK(w.dof == 4.0);
}

TEST_CASE("the scatter of correlated parts: a chain with known correlation") {
  // x_k = (e_k + a e_{k-1}): correlation a / (1 + a^2) of neighbours only; variance of the mean of
  // n: (1 + a^2) / n (1 + 2 rho (n - 1) / n).
  const double a = 0.3, rho = a / (1.0 + a * a);
  constexpr int kParts = 10, kRepeats = 4000;
  std::mt19937_64 random(5);
  std::normal_distribution<double> normal;
  double mean_variance = 0.0;
  for (int r = 0; r < kRepeats; ++r) {
    std::vector<double> parts;
    double last = normal(random);
    for (int k = 0; k < kParts; ++k) {
      const double e = normal(random);
      parts.push_back(e + a * last);
      last = e;
    }
    const double u = mean_by_scatter(parts, rho).u;
    mean_variance += u * u / kRepeats;
  }
  const double truth = (1.0 + a * a) / kParts * (1.0 + 2.0 * rho * 0.9);
  // Each variance has a relative deviation of sqrt(2 / 9), some more for the correlation: 0.8 % of
  // the mean of 4000; five of them. The correction is exact for a chain like this.
  CHECK(std::abs(mean_variance / truth - 1.0) < 0.045);
}

TEST_CASE("intervals of the quasi-peak reading cover its long-term mean") {
  constexpr int kRepeats = 40;
  const Hertz rate(160000.0);
  std::mt19937_64 random(9);
  std::normal_distribution<double> normal;
  std::vector<Uncertain> readings;
  double mean = 0.0;
  for (int r = 0; r < kRepeats; ++r) {
    std::vector<double> x(samples_in(Seconds(2.5), rate));
    for (double& v : x) v = normal(random);
    readings.push_back(quasi_peak_reading(x, rate, 5));
    mean += readings.back().value / kRepeats;
  }
  int covered = 0;
  for (const Uncertain& r : readings) covered += covers(r, mean);
  // The mean of 40 is itself in doubt by a sixth of one: that costs less than a point in a hundred.
  CHECK(covered >= fewest(kRepeats, 0.94, 0.001));
}
