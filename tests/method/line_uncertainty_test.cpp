// SPDX-License-Identifier: GPL-3.0-or-later
// The uncertainty of one line against the scatter it really has. Tolerances: four or five standard
// deviations of a mean over the repeats, unless they say otherwise.
#include <doctest/doctest.h>

#include <cmath>

#include "method/block_spectra.h"
#include "method/random_noise.h"
#include "method/reading.h"

using namespace kneeprint;
using namespace kneeprint::testing;

namespace {

constexpr HoldLayout kHold{0, 1200, 5};  // blocks of 0.1 s at 12 kHz: bins of 10 Hz
constexpr Hertz kRate{12000.0};

Waveform tone(double peak, std::size_t bin, double phase = 0.0) {
  Waveform w{kRate, std::vector<double>(kHold.end())};
  for (std::size_t n = 0; n < w.samples.size(); ++n) {
    w.samples[n] =
        peak *
        std::cos(2.0 * std::numbers::pi * static_cast<double>(bin * n % 1200) / 1200.0 + phase);
  }
  return w;
}

// Noise of this sigma gives a block's line components of u = 1.
const double kUnit = std::sqrt(1200.0 / 2.0);

double no_turn(int) { return 0.0; }

}  // namespace

TEST_CASE("noise that falls with frequency is read in the middle of its neighbours") {
  constexpr int kRepeats = 400;
  for (const std::size_t bin : {6, 12, 40}) {
    CAPTURE(bin);
    const auto f = static_cast<double>(bin) * 10.0;
    double squares = 0.0, stated = 0.0;
    Random random(61);
    for (int r = 0; r < kRepeats; ++r) {
      Waveform w{kRate, std::vector<double>(kHold.end())};
      add_pink(w, kUnit, Hertz(f), random);
      const BlockSpectra spectra(w, kHold, bin);
      squares += std::norm(spectra.mean(bin, 0, no_turn).mean) / 2.0 / kRepeats;
      const double sigma = spectra.noise_around(bin, 0).sigma;
      stated += sigma * sigma / 5.0 / kRepeats;
    }
    // A mixture of noises of 1/k on either side has its median 3 to 7 % high in amplitude (bins 12
    // and 6), the scatter itself is known to 1 / sqrt(2 x 400) = 3.5 % of amplitude.
    CHECK(std::sqrt(stated / squares) > 1.0 - 0.14);
    CHECK(std::sqrt(stated / squares) < 1.07 + 0.14);
  }
}

TEST_CASE("a tone's amplitude is unbiased down to where it may serve as a reference") {
  constexpr int kRepeats = 4000;
  constexpr double kPeak = 3.0;  // of the noise in one block
  double sum = 0.0, squares = 0.0;
  Random random(62);
  const Waveform clean = tone(kPeak, 40, 0.3);
  for (int r = 0; r < kRepeats; ++r) {
    Waveform w = clean;
    add_white(w, kUnit, random);
    const Line line = BlockSpectra(w, kHold, 40).tone(40, 0);
    sum += line.mean.real() / kRepeats;
    squares += line.u * line.u / kRepeats;
  }
  // The mean of plain amplitudes would be 1 / (2 x 3) = 0.167 high; what is left is of the order
  // 1 / (8 x 27). A mean of 4000 with u = 1 / sqrt 5 is known to 0.007.
  CHECK(std::abs(sum - kPeak) < 1.0 / 216.0 + 0.035);
  CHECK(std::sqrt(squares) == doctest::Approx(1.0 / std::sqrt(5.0)).epsilon(0.02));
}

TEST_CASE("a tone whose own amplitude scatters says so in full") {
  // Blocks of random amplitude, far beyond the noise: the mean's variance is that of the blocks
  // / 5.
  constexpr int kRepeats = 2000;
  constexpr double kScatter = 0.01;
  double squares = 0.0;
  Random random(63);
  const Waveform clean = tone(1.0, 40);
  for (int r = 0; r < kRepeats; ++r) {
    Waveform w = clean;
    for (std::size_t b = 0; b < 5; ++b) {
      const double gain = 1.0 + kScatter * gaussian(random);
      for (std::size_t n = 0; n < 1200; ++n) w.samples[b * 1200 + n] *= gain;
    }
    add_white(w, 1e-5, random);
    const Line line = BlockSpectra(w, kHold, 40).tone(40, 0);
    CHECK(line.dof < 5.0);
    squares += line.u * line.u / kRepeats;
  }
  // Chi-square of 4 dof, 2000 times: the variance is known to sqrt(2 / 8000) = 1.6 %.
  CHECK(squares == doctest::Approx(kScatter * kScatter / 5.0).epsilon(0.08));
}

TEST_CASE("hum on a line's own bin is a type B term, elsewhere nothing") {
  Random random(64);
  Waveform w = tone(1.0, 100);
  add_white(w, 1e-3 * kUnit, random);
  const BlockSpectra quiet(w, kHold, 100);
  // 0.05 Hz of the fundamental, so 1 Hz at 1 kHz: 0.1 bins, which cost 1 % of a line.
  add_hum(w, 1.0, random);
  const BlockSpectra hum(w, kHold, 100);
  const auto at = [](const BlockSpectra& s, std::size_t bin) {
    return s.hum_at(bin, 0, s.noise_around(bin, 0));
  };
  // The line at 1 kHz has 1 / 20; those around it 1 / 14 .. 1 / 26, of rms 1 / 19.3. Over five
  // blocks the phase swings by up to half a turn, which costs up to 36 %.
  CHECK(at(hum, 100) < 1.02 / 19.3);
  CHECK(at(hum, 100) > 0.6 / 19.3);
  CHECK(at(hum, 101) == 0.0);
  CHECK(at(quiet, 100) < 1e-3);
  const auto u = [](const BlockSpectra& s) { return s.mean(100, 0, no_turn).u; };
  CHECK(u(hum) > 10.0 * u(quiet));
}

TEST_CASE("noise alone serves as no reference, however long it is averaged") {
  Random random(65);
  for (const int blocks : {4, 40, 400}) {
    CAPTURE(blocks);
    const HoldLayout hold{0, 1200, blocks};
    Waveform w{kRate, std::vector<double>(hold.end())};
    add_white(w, 1.0, random);
    CHECK_FALSE(serves_as_reference(BlockSpectra(w, hold, 40).tone(40, 0), blocks));
    for (std::size_t n = 0; n < w.samples.size(); ++n) {
      w.samples[n] +=
          5.0 / kUnit *
          std::cos(2.0 * std::numbers::pi * static_cast<double>(n * 40 % 1200) / 1200.0);
    }
    CHECK(serves_as_reference(BlockSpectra(w, hold, 40).tone(40, 0), blocks));
  }
}
