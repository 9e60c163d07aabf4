// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/quasi_peak.h"

#include <cmath>
#include <numbers>

namespace kneeprint {
namespace {

constexpr Seconds kFastAttack{0.00112}, kFastDecay{0.240};
constexpr Seconds kSlowAttack{0.200}, kSlowDecay{0.260};
// What both stages show of a steady sine of peak 1, in the limit of many samples per cycle.
constexpr double kSteadySine = 0.54362;

}  // namespace

QuasiPeakMeter::Stage QuasiPeakMeter::stage(Seconds attack, Seconds decay, Hertz rate) {
  return {-std::expm1(-1.0 / cycles(rate, attack)), std::exp(-1.0 / cycles(rate, decay)), 0.0};
}

QuasiPeakMeter::QuasiPeakMeter(Hertz rate)
    : fast_(stage(kFastAttack, kFastDecay, rate)), slow_(stage(kSlowAttack, kSlowDecay, rate)) {}

double QuasiPeakMeter::Stage::step(double x) {
  if (x > charge) charge += (x - charge) * attack;
  charge *= keep;
  return charge;
}

double QuasiPeakMeter::step(double x) {
  constexpr double kToRms = 1.0 / (std::numbers::sqrt2 * kSteadySine);
  return kToRms * slow_.step(fast_.step(std::abs(x)));
}

}  // namespace kneeprint
