// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/level_scale.h"

#include <cmath>

namespace kneeprint {

std::string_view name(LevelUnit unit) { return unit == LevelUnit::dbu ? "dBu" : "dBFS"; }

LevelScale LevelScale::calibrated(VoltsRms full_scale, Decibels standard_uncertainty) {
  return {LevelUnit::dbu, to_dbu(full_scale).value(), sine_peak(full_scale).value(),
          standard_uncertainty};
}

double LevelScale::level_of_peak(double peak_sample) const {
  return 20.0 * std::log10(peak_sample) + offset_db;
}

double LevelScale::peak_of_level(double level) const {
  return std::pow(10.0, (level - offset_db) / 20.0) * peak_per_full_scale;
}

}  // namespace kneeprint
