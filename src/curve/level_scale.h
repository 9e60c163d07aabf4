// SPDX-License-Identifier: GPL-3.0-or-later
// What a converter's full scale means outside: the one place where samples become volts and levels.
#pragma once

#include <string_view>

#include "quantity/level.h"
#include "quantity/uncertain.h"

namespace kneeprint {

enum class LevelUnit { dbfs, dbu };
std::string_view name(LevelUnit unit);  ///< "dBFS", "dBu"

/// Scale of one direction (send or return). Uncalibrated: levels are dBFS and "volts" are full
/// scales.
struct LevelScale {
  LevelUnit unit = LevelUnit::dbfs;
  double offset_db = 0.0;  ///< level in `unit` of a full-scale sine
  double peak_per_full_scale =
      1.0;  ///< volts peak (calibrated) or 1 (full scales) at sample value 1
  Decibels standard_uncertainty{0.0};  ///< of the full-scale voltage, type B; 0 when uncalibrated

  static LevelScale uncalibrated() { return {}; }
  /// `full_scale` is the rms voltage of a full-scale sine at the unit's terminals.
  static LevelScale calibrated(VoltsRms full_scale, Decibels standard_uncertainty);
  bool is_calibrated() const { return unit != LevelUnit::dbfs; }

  double level_of(LevelDbfs l) const { return l.value() + offset_db; }
  LevelDbfs dbfs_of(double level) const { return LevelDbfs(level - offset_db); }
  /// Level of a sine of that peak sample value (> 0).
  double level_of_peak(double peak_sample) const;
  /// Volts peak (or full scales) of a sine at `level`.
  double peak_of_level(double level) const;
};

}  // namespace kneeprint
