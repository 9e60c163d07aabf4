// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/push_pull.h"

#include <boost/math/tools/roots.hpp>
#include <cmath>
#include <limits>
#include <utility>

#include "unit/fet_law.h"
#include "unit/settings.h"

namespace kneeprint {
namespace {

constexpr double kTableRange = 7.0;  // 42 V at the input

// Current into the load node with the load at `vo`, and its derivatives.
struct NodeCurrent {
  double current, by_output, by_input;
};
NodeCurrent node_current(double u, double vo) {
  using Unit = PushPullUnit;
  const DrainCurrent up = ekv_drain_current(u + Unit::kBias - vo, Unit::kRail - vo, Unit::kBeta);
  const DrainCurrent down = ekv_drain_current(vo + Unit::kBias - u, Unit::kRail + vo, Unit::kBeta);
  return {up.current - down.current - vo / Unit::kLoadOhms,
          -(up.by_gate + up.by_drain + down.by_gate + down.by_drain) - 1.0 / Unit::kLoadOhms,
          up.by_gate + down.by_gate};
}

std::unique_ptr<VirtualUnit> make_push_pull(const UnitSettings& settings, Hertz) {
  SettingsReader("push-pull", settings).finish();
  return std::make_unique<PushPullUnit>();
}

}  // namespace

OddTable::Sample push_pull_output(double u) {
  std::uintmax_t steps = 100;
  const double vo =
      u == 0.0 ? 0.0
               : boost::math::tools::newton_raphson_iterate(
                     [u](double v) {
                       const NodeCurrent i = node_current(u, v);
                       return std::pair(i.current, i.by_output);
                     },
                     0.5 * std::min(std::fabs(u), PushPullUnit::kRail) * (u < 0.0 ? -1.0 : 1.0),
                     -PushPullUnit::kRail, PushPullUnit::kRail, std::numeric_limits<double>::digits,
                     steps);
  const NodeCurrent i = node_current(u, vo);
  return {vo, -i.by_input / i.by_output};
}

// 512 cells per octave from 1/8 V: the devices bend over some 2 n Vt = 78 mV, cells are 1 mV or
// less.
PushPullUnit::PushPullUnit() : pair_(push_pull_output, kTableRange, 0.125, 9) {}

void PushPullUnit::process(std::span<double> volts) {
  for (double& v : volts) v = kStepUp * pair_(kPad * v);
}

constinit const UnitRecord kPushPullUnit{
    "push-pull",
    "class AB battery line driver (invented)",
    "Pad 1:6, complementary source followers on +-1.5 V with too little bias (EKV transistor law) "
    "into 300 ohm, ideal 1:7 transformer. No memory.",
    64,
    "",
    make_push_pull};

}  // namespace kneeprint
