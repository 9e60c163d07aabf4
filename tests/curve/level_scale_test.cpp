// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/level_scale.h"

#include <doctest/doctest.h>

using namespace kneeprint;

TEST_CASE("uncalibrated: levels are dBFS and volts are full scales") {
  const LevelScale s = LevelScale::uncalibrated();
  CHECK(name(s.unit) == "dBFS");
  CHECK(s.level_of(LevelDbfs(-20.0)) == -20.0);
  CHECK(s.peak_of_level(-20.0) == doctest::Approx(0.1));
}

TEST_CASE("+4 dBu at -20 dBFS: full scale is 12.276529880 V rms, 17.361635055 V peak") {
  const LevelScale s = LevelScale::calibrated(to_volts(LevelDbu(24.0)), Decibels(0.01));
  CHECK(name(s.unit) == "dBu");
  CHECK(s.peak_per_full_scale == doctest::Approx(17.361635055).epsilon(1e-9));
  CHECK(s.level_of(LevelDbfs(-20.0)) == doctest::Approx(4.0));
  CHECK(s.dbfs_of(4.0).value() == doctest::Approx(-20.0));
  CHECK(s.level_of_peak(0.1) == doctest::Approx(4.0));
  // +4 dBu = 1.736164 V peak.
  CHECK(s.peak_of_level(4.0) == doctest::Approx(1.736164).epsilon(1e-6));
}
