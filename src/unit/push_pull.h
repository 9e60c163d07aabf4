// SPDX-License-Identifier: GPL-3.0-or-later
// Battery line driver: pad -> complementary source followers in class AB on +-1.5 V, biased too low
// -> ideal step-up transformer. Crossover distortion at low level, soft limit at the rails.
//
//   vo/RL = Id(u + bias - vo, rail - vo) - Id(-u + bias + vo, rail + vo),  u = kPad input,
//   output = kStepUp vo;  Id(Vgs - Vto, Vds): the law of fet_law.h. No memory.
#pragma once

#include "unit/odd_table.h"
#include "unit/unit.h"

namespace kneeprint {

/// vo and dvo/du of the pair alone.
OddTable::Sample push_pull_output(double u);

class PushPullUnit : public VirtualUnit {
 public:
  static constexpr double kPad = 1.0 / 6.0;
  static constexpr double kStepUp = 7.0;
  static constexpr double kRail = 1.5;        ///< V
  static constexpr double kLoadOhms = 300.0;  ///< seen by the pair
  static constexpr double kBeta = 1.0;        ///< A/V^2, each device
  static constexpr double kBias = -0.15;      ///< V, each gate beyond its threshold

  PushPullUnit();
  void process(std::span<double> volts) override;

 private:
  OddTable pair_;
};

extern const UnitRecord kPushPullUnit;

}  // namespace kneeprint
