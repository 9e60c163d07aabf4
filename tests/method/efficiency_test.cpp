// SPDX-License-Identifier: GPL-3.0-or-later
// No unbiased reading of an amplitude scatters less than var = 2 sigma^2 / N in white noise (Rife &
// Boorstyn 1974), for every order of a whole-period record. KNEEPRINT_LONG=1: 5000 repeats.
#include <doctest/doctest.h>

#include <array>
#include <vector>

#include "method/acceptance.h"
#include "method/repeats.h"

using namespace kneeprint;
using namespace kneeprint::testing;

TEST_CASE("efficiency: H1 to H5 scatter as the Cramer-Rao bound has it, and say so") {
  const int n = repeats(500, 5000);
  const TakeSpec spec = short_spec("steady", Hertz(997.0));
  const Stimulus stimulus = find_method("steady")->stimulus(spec, SteadyRepeats::kRate);
  // Every harmonic stands 30 times over its bound: taking the noise's share off the amplitude does
  // not narrow the scatter there (under 0.1 %).
  const Polynomial unit = with_harmonics(0.02, 0.02, 0.02, 0.02);
  const double peak = sine_peak(spec.send);
  Waveform clean = stimulus.wave;
  for (double& x : clean.samples) x = peak * unit(x / peak);
  const double length =
      static_cast<double>(stimulus.hold.block) * static_cast<double>(stimulus.hold.blocks);
  const double bound = 6e-4 * peak, sigma = bound * std::sqrt(length / 2.0);

  std::array<double, 5> sum{}, squares{}, stated{};
  Random random(41);
  int averaged_all = 0;
  for (int r = 0; r < n; ++r) {
    Waveform take = clean;
    add_white(take, sigma, random);
    const Curves c = read(spec, take);
    averaged_all += c.levels.at(0).blocks == stimulus.hold.blocks;
    for (std::size_t i = 0; i < 5; ++i) {
      const HarmonicPoint& h = c.harmonics.at(i);
      const double off = sine_peak(LevelDbfs(*h.level)) -
                         peak * std::abs(unit.harmonic(static_cast<int>(i) + 1, 1.0));
      sum[i] += off;
      squares[i] += off * off;
      stated[i] += h.component_u * h.component_u;
    }
  }
  // Now and then noise looks like settling (three standard uncertainties) and a block is dropped.
  CHECK(averaged_all >= n * 9 / 10);
  for (std::size_t i = 0; i < 5; ++i) {
    CAPTURE(i);
    const double scatter = std::sqrt((squares[i] - sum[i] * sum[i] / n) / (n - 1.0));
    const double said = std::sqrt(stated[i] / n);
    AcceptedRatio accepted = accepted_deviation(n - 1.0);
    if (long_form()) accepted = {0.95, 1.05, chance_of_deviation(n - 1.0, 0.05)};
    report(
        fmt::format("efficiency H{}: scatter {:.4f}, stated {:.4f} of the Cramer-Rao bound, bias "
                    "{:+.3f} of it, {} repeats; a right program fails with {:.1e}",
                    i + 1, scatter / bound, said / bound, sum[i] / n / bound, n, accepted.chance));
    CHECK(scatter >= accepted.least * bound);
    CHECK(scatter <= accepted.most * bound);
    CHECK(accepted.chance <= kCheckChance);
    // Each stated variance has some 190 degrees of freedom: a mean of 500 of them is known to 0.5
    // %.
    CHECK(said == doctest::Approx(bound).epsilon(0.03));
  }
}
