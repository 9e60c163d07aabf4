// SPDX-License-Identifier: GPL-3.0-or-later
// The sine fits of IEEE Std 1057 (three parameters: frequency known; four: frequency found too;
// steps from memory), written with Eigen, against what the steady method reads from the same take.
#include <doctest/doctest.h>

#include <Eigen/Dense>
#include <cmath>
#include <complex>
#include <numbers>
#include <vector>

#include "method/steady.h"
#include "method/synthetic.h"

using namespace kneeprint;
using kneeprint::testing::read;
using kneeprint::testing::response;
using kneeprint::testing::spec_for;

namespace {

struct SineFit {
  double turns = 0.0;  // cycles per sample
  double a = 0.0, b = 0.0, offset = 0.0;
  double rms_residual = 0.0;

  double amplitude() const { return std::hypot(a, b); }
  double phase() const { return std::atan2(-b, a); }  // of amplitude * cos(omega n + phase)
  double sinad_db() const {
    return 20.0 * std::log10(amplitude() / std::numbers::sqrt2 / rms_residual);
  }
};

Eigen::VectorXd solve(const Eigen::MatrixXd& columns, const Eigen::VectorXd& y) {
  return columns.colPivHouseholderQr().solve(y);
}

SineFit three_parameters(const Eigen::VectorXd& y, double turns) {
  Eigen::MatrixXd columns(y.size(), 3);
  for (Eigen::Index n = 0; n < y.size(); ++n) {
    const double angle = 2.0 * std::numbers::pi * turns * static_cast<double>(n);
    columns.row(n) << std::cos(angle), std::sin(angle), 1.0;
  }
  const Eigen::VectorXd x = solve(columns, y);
  const double rms = (y - columns * x).norm() / std::sqrt(static_cast<double>(y.size()));
  return {turns, x[0], x[1], x[2], rms};
}

// One pass of the four-parameter fit: linearised in the frequency about the last pass.
SineFit next_pass(const Eigen::VectorXd& y, const SineFit& last) {
  Eigen::MatrixXd columns(y.size(), 4);
  for (Eigen::Index n = 0; n < y.size(); ++n) {
    const auto t = static_cast<double>(n);
    const double angle = 2.0 * std::numbers::pi * last.turns * t;
    const double c = std::cos(angle), s = std::sin(angle);
    columns.row(n) << c, s, 1.0, -last.a * t * s + last.b * t * c;
  }
  const Eigen::VectorXd x = solve(columns, y);
  SineFit fit{last.turns + x[3] / (2.0 * std::numbers::pi), x[0], x[1], x[2], 0.0};
  const SineFit there = three_parameters(y, fit.turns);
  fit.rms_residual = there.rms_residual;
  return fit;
}

SineFit four_parameters(const Eigen::VectorXd& y, double start, int passes) {
  SineFit fit = three_parameters(y, start);
  for (int i = 0; i < passes; ++i) fit = next_pass(y, fit);
  return fit;
}

// The blocks of a take that the reading kept.
Eigen::VectorXd kept_part(const TakeSpec& spec, const Waveform& take, const LevelPoint& level) {
  const HoldLayout hold = find_method("steady")->stimulus(spec, take.rate).hold;
  const std::size_t size = hold.block * static_cast<std::size_t>(level.blocks);
  return Eigen::Map<const Eigen::VectorXd>(take.samples.data() + (hold.end() - size),
                                           static_cast<Eigen::Index>(size));
}

void take_out(Eigen::VectorXd& y, const SineFit& fit) {
  for (Eigen::Index n = 0; n < y.size(); ++n) {
    const double angle = 2.0 * std::numbers::pi * fit.turns * static_cast<double>(n);
    y[n] -= fit.a * std::cos(angle) + fit.b * std::sin(angle) + fit.offset;
  }
}

// Beyond it the harmonics of the curve below are under 1e-15.
constexpr int kOrdersOfCurve = 60;

double decibels(double ratio) { return 20.0 * std::log10(ratio); }

}  // namespace

TEST_CASE("the sine fits themselves, on a worked record") {
  // y_n = round(1000 (0.8 cos(2 pi 0.07 n + 0.4) + 0.05)) / 1000, n = 0 .. 31; solutions by normal
  // equations in 40 digits and by variable projection.
  Eigen::VectorXd y(32);
  for (Eigen::Index n = 0; n < y.size(); ++n) {
    const double angle = 2.0 * std::numbers::pi * 0.07 * static_cast<double>(n) + 0.4;
    y[n] = std::round(1000.0 * (0.8 * std::cos(angle) + 0.05)) / 1000.0;
  }
  const SineFit three = three_parameters(y, 0.07);
  CHECK(std::abs(three.a - 0.736766257422315) < 1e-10);
  CHECK(std::abs(three.b - -0.311554196460643) < 1e-10);
  CHECK(std::abs(three.offset - 0.0500820733744661) < 1e-10);
  CHECK(std::abs(three.amplitude() - 0.799931581704537) < 1e-10);
  CHECK(std::abs(three.phase() - 0.400062659413183) < 1e-10);
  CHECK(std::abs(three.rms_residual - 2.59877726119e-4) < 1e-14);

  const double passes[] = {0.0700001924563251, 0.0700002212149793, 0.0700002212051165,
                           0.070000221205121};
  for (int i = 0; i < 4; ++i) {
    CHECK(std::abs(four_parameters(y, 0.0705, i + 1).turns - passes[i]) < 1e-12);
  }
  const SineFit four = four_parameters(y, 0.0705, 6);
  CHECK(std::abs(four.a - 0.736773122615148) < 1e-10);
  CHECK(std::abs(four.b - -0.31153822971765) < 1e-10);
  CHECK(std::abs(four.offset - 0.0500810962987284) < 1e-10);
  CHECK(std::abs(four.amplitude() - 0.799931686323078) < 1e-10);
  CHECK(std::abs(four.phase() - 0.40004093282945) < 1e-10);
  CHECK(std::abs(four.rms_residual - 2.59771611508e-4) < 1e-14);
}

TEST_CASE("a steady reading is the three-parameter sine fit of its take") {
  // Without noise first, where both must agree to rounding, then with it.
  for (const double sigma : {0.0, 1e-4}) {
    CAPTURE(sigma);
    for (const double asked : {41.0, 997.0, 4990.0}) {
      CAPTURE(asked);
      const TakeSpec spec = spec_for("steady", asked, -6.0);
      RigView rig;
      rig.sees_dc = true;
      const Waveform take = response(
          spec, [](double x) { return std::tanh(1.5 * x + 0.3) - std::tanh(0.3); }, sigma);
      const Curves c = read(spec, take, rig);
      const LevelPoint& level = c.levels.at(0);
      const Eigen::VectorXd y = kept_part(spec, take, level);
      const double turns = level.frequency_hz / take.rate.value();
      const SineFit fit = three_parameters(y, turns);

      CHECK(std::abs(c.harmonics.at(0).in_phase - fit.amplitude()) < 1e-9 * fit.amplitude());
      CHECK(std::abs(*level.output - decibels(fit.amplitude())) < 1e-8);
      CHECK(std::abs(*level.dc - fit.offset) < 1e-12);
      // The stimulus is a cosine of phase 0 at every block's start; the first block kept is read.
      const SineFit first = three_parameters(y.head(y.size() / level.blocks), turns);
      CHECK(std::abs(*c.responses.at(0).phase_deg - first.phase() * 180.0 / std::numbers::pi) <
            1e-6);
      if (sigma > 0.0) continue;
      // The record goes up to half the rate, the reading's band from 20 Hz to 20 kHz: orders that
      // stand, or were folded to, above it are fitted and taken out as well.
      Eigen::VectorXd rest = y;
      take_out(rest, fit);
      for (int order = 2; order <= kOrdersOfCurve; ++order) {
        const double there = std::abs(std::remainder(order * turns, 1.0));
        if (there * take.rate.value() > 20000.0) take_out(rest, three_parameters(rest, there));
      }
      const double rms = rest.norm() / std::sqrt(static_cast<double>(y.size()));
      const double signal = fit.amplitude() / std::numbers::sqrt2;
      CHECK(std::abs(*level.sinad_db - decibels(signal / rms)) < 1e-6);
      CHECK(std::abs(*level.thdn_percent - 100.0 * rms / std::hypot(rms, signal)) <
            1e-7 * *level.thdn_percent);
    }
  }
}

TEST_CASE("under white noise SINAD is that of the fit, less the noise outside the band") {
  const TakeSpec spec = spec_for("steady", 997.0, -6.0);
  const Waveform take = response(
      spec, [](double x) { return x; }, 1e-3, 5);
  const LevelPoint level = read(spec, take).levels.at(0);
  const Eigen::VectorXd y = kept_part(spec, take, level);
  const SineFit fit = three_parameters(y, level.frequency_hz / take.rate.value());
  // White noise of 24 kHz seen through 20 Hz .. 20 kHz. Scatter of a band's mean square: 1/sqrt of
  // the number of its bins (20 kHz times 1.5 s and more: 0.03 dB); four of that for the difference.
  const double band = 10.0 * std::log10(19980.0 / 24000.0);
  const double bins = 4000.0 * static_cast<double>(y.size()) / take.rate.value();
  CHECK(std::abs(*level.sinad_db - (fit.sinad_db() - band)) < 4.0 * 4.343 / std::sqrt(bins));
  // The same figure as noise of a sine of equal rms.
  CHECK(std::abs(*level.noise - (*level.output - *level.sinad_db)) < 0.01);
}

TEST_CASE("the four-parameter fit finds the frequency that the table states") {
  for (const double asked : {41.0, 997.0, 4990.0}) {
    CAPTURE(asked);
    // A wire: harmonics would pull the frequency, being no part of the four-parameter model.
    const double sigma = 1e-4;
    const TakeSpec spec = spec_for("steady", asked, -6.0);
    const Waveform take = response(
        spec, [](double x) { return x; }, sigma, 9);
    const LevelPoint level = read(spec, take).levels.at(0);
    const Eigen::VectorXd y = kept_part(spec, take, level);
    const auto size = static_cast<double>(y.size());
    // Start a quarter of a bin away.
    const SineFit fit = four_parameters(y, level.frequency_hz / take.rate.value() + 0.25 / size, 6);
    // var omega >= 24 sigma^2 / (A^2 N (N^2 - 1)) (Rife & Boorstyn 1974); four standard deviations.
    const double bound = std::sqrt(24.0 / (size * (size * size - 1.0))) * sigma / fit.amplitude();
    const double omega_off =
        2.0 * std::numbers::pi * (fit.turns - level.frequency_hz / take.rate.value());
    CHECK(std::abs(omega_off) < 4.0 * bound);
    CHECK(std::abs(*level.output - decibels(fit.amplitude())) < 1e-6);
  }
}

TEST_CASE("an ideal converter's SINAD is 6.02 N + 1.76 dB") {
  // 12 bits, full-scale sine: 20 log10(2) N + 10 log10(1.5) = 74.008 dB for error spread evenly
  // over 24 kHz (Bennett, BSTJ 27, 1948); the reading's band ends at 20 kHz.
  const TakeSpec spec = spec_for("steady", 997.0, -0.001);
  const double step = 2.0 / 4096.0;
  const Waveform take = response(spec, [&](double x) { return step * std::round(x / step); });
  const LevelPoint level = read(spec, take).levels.at(0);
  const Eigen::VectorXd y = kept_part(spec, take, level);
  const SineFit fit = three_parameters(y, level.frequency_hz / take.rate.value());
  // The error's mean square under a sine of A steps is 1/12 + sum (-1)^n J0(2 pi n A) / (pi n)^2
  // steps squared; with A = 2048 the first term is at most 0.9 % of it: 0.04 dB.
  CHECK(std::abs(fit.sinad_db() - 74.008) < 0.04);
  CHECK(std::abs(*level.sinad_db - (74.008 - 10.0 * std::log10(19980.0 / 24000.0))) < 0.04);
}
