// SPDX-License-Identifier: GPL-3.0-or-later
// Do the stated 95 % intervals hold the truth in 95 % of measurements? Beside noise, everything
// that the rig calls uncertain is drawn anew each time (repeats.h). KNEEPRINT_LONG=1: 8000 repeats
// (near noise and floor 3000) in place of 200.
#include <doctest/doctest.h>

#include <boost/math/distributions/non_central_chi_squared.hpp>

#include "method/acceptance.h"
#include "method/block_spectra.h"
#include "method/repeats.h"

using namespace kneeprint;
using namespace kneeprint::testing;

namespace {

constexpr int kShort = 200, kLong = 8000, kLongOneSided = 3000;

void judge(const std::string& where, const Tallies& tallies,
           AcceptedCounts (*accepted_of)(int repeats)) {
  for (const auto& [figure, t] : tallies) {
    CAPTURE(where);
    CAPTURE(figure);
    const AcceptedCounts accepted = accepted_of(t.repeats);
    report(
        fmt::format("coverage {:18} {:6} {:6.2f} % of {} (interval below the truth {}, above {}; "
                    "limits {}); a right program fails with {:.1e}",
                    where, figure, 100.0 * t.covered / t.repeats, t.repeats, t.below, t.above,
                    t.limits, accepted.chance));
    CHECK(t.covered >= accepted.least);
    CHECK(t.covered <= accepted.most);
    CHECK(accepted.chance <= kCheckChance);
  }
}

// No single term dominates: the noise, the calibration of either converter and the rig's residuals
// have shares of the same order.
void cover(NoiseKind kind) {
  const Polynomial steady = with_harmonics(0.02, 0.011, 0.010, 0.00625);
  const Polynomial cubic{0.05, 0.06};
  const int n = repeats(kShort, kLong);
  const std::string where(name(kind));
  judge(where, tally(SteadyRepeats(kind, 1e-3, steady), n, 11), accepted_coverage);
  judge(where, tally(TwoToneRepeats("smpte", kind, 4e-4, cubic), n, 12), accepted_coverage);
  judge(where, tally(TwoToneRepeats("ccif", kind, 5e-4, cubic), n, 13), accepted_coverage);
}

// Rice's distribution (Rice 1944): (r / u)^2 is non-central chi-square of 2 dof.
double chance_to_read_below(double r, double amplitude) {
  if (amplitude == 0.0) return 1.0 - std::exp(-0.5 * r * r);
  return cdf(boost::math::non_central_chi_squared(2.0, amplitude * amplitude), r * r);
}

}  // namespace

TEST_CASE("coverage in white noise") { cover(NoiseKind::white); }
TEST_CASE("coverage in 1/f noise") { cover(NoiseKind::pink); }
TEST_CASE("coverage beside wandering mains lines") { cover(NoiseKind::mains); }

TEST_CASE("near the noise, value or limit, whichever is stated, covers") {
  const int n = repeats(kShort, kLongOneSided);
  const Doubts none{0.0, 0.0, -160.0};
  const double u = 1e-3;
  judge(
      "0 1 2 3 u",
      tally(SteadyRepeats(NoiseKind::white, u, with_harmonics(0.0, u, 2 * u, 3 * u), none), n, 21),
      accepted_at_least);
  judge("4 0.5 1.5 2.5 u",
        tally(SteadyRepeats(NoiseKind::white, u, with_harmonics(4 * u, 0.5 * u, 1.5 * u, 2.5 * u),
                            none),
              n, 22),
        accepted_at_least);
  // Each line of a pair at so many u: of smpte c2 U1 U2 and 3/4 c3 U1^2 U2, of ccif c2 U1 U2 (one
  // line) and 3/4 c3 U1^2 U2.
  for (const auto& [second, third] :
       {std::pair(0.0, 1.0), std::pair(2.0, 3.0), std::pair(4.0, 0.0)}) {
    const std::string where = fmt::format("{} {} u", second, third);
    const double v = 2e-4;
    judge(where,
          tally(TwoToneRepeats("smpte", NoiseKind::white, v, {second * v / 0.16, third * v / 0.096},
                               none),
                n, 23),
          accepted_at_least);
    judge(where,
          tally(TwoToneRepeats("ccif", NoiseKind::white, v,
                               {second * v / 0.25, third * v / 0.09375}, none),
                n, 24),
          accepted_at_least);
  }
}

TEST_CASE("where the rig's residual rules, intervals cover no less") {
  // A residual of known amplitude a and any phase never errs by more than a, and 1.96 a / sqrt 2 is
  // more than that: the nearer to alone it is, the nearer to 100 %.
  const int n = repeats(kShort, kLongOneSided);
  const Doubts floor{0.002, 0.002, -58.0};
  judge("floor",
        tally(SteadyRepeats(NoiseKind::white, 5e-4, with_harmonics(0.03, 0.03, 0.03, 0.03), floor),
              n, 31),
        accepted_at_least);
  judge("floor", tally(TwoToneRepeats("smpte", NoiseKind::white, 1e-4, {0.05, 0.06}, floor), n, 32),
        accepted_at_least);
  judge("floor", tally(TwoToneRepeats("ccif", NoiseKind::white, 1e-4, {0.05, 0.06}, floor), n, 33),
        accepted_at_least);
}

TEST_CASE("an upper limit errs in 2.5 % of readings, value and limit together in 5.5 % at most") {
  // No random numbers: Rice's distribution function on a grid of amplitudes and readings, u = 1.
  const double threshold = noise_threshold(1.0);
  for (double amplitude = 0.0; amplitude < 6.0; amplitude += 0.25) {
    CAPTURE(amplitude);
    double limit_misses = 0.0, misses = 0.0;
    constexpr double kStep = 0.01;
    for (double r = 0.0; r < 12.0; r += kStep) {
      const double chance =
          chance_to_read_below(r + kStep, amplitude) - chance_to_read_below(r, amplitude);
      const double read = r + 0.5 * kStep;
      const bool limit_covers = amplitude_upper_limit(read, 1.0) >= amplitude;
      if (!limit_covers) limit_misses += chance;
      const double error = std::abs(without_noise(read, 1.0) - amplitude);
      const bool covers =
          read <= threshold ? limit_covers : error <= coverage_factor_95(kInfiniteDof);
      if (!covers) misses += chance;
    }
    // A step of the grid holds at most 0.01 / sqrt(2 pi) = 0.4 % of the readings.
    CHECK(limit_misses <= 0.025 + 0.004);
    CHECK(misses <= 0.055);
  }
}
