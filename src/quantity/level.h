// SPDX-License-Identifier: GPL-3.0-or-later
// Decibels (a ratio) and levels (a decibel value with its reference), kept apart:
// level - level = decibels, level + decibels = level, level + level does not compile.
//
//   dBu   20 log10(V / sqrt(0.6 V^2))   0 dBu = 1 mW in 600 ohm = 0.774597 V rms [common practice]
//   dBV   20 log10(V / 1 V)
//   dBFS  a full-scale sine is 0 dBFS [AES17-2015, clause 3.12, from memory], so a full-scale
//         square wave is +3.01 dBFS
#pragma once

#include <cmath>
#include <compare>
#include <numbers>

#include "quantity/quantity.h"

namespace kneeprint {

class Decibels {
 public:
  constexpr Decibels() = default;
  constexpr explicit Decibels(double value) : value_(value) {}
  constexpr double value() const { return value_; }
  /// 20 log10 of an amplitude ratio (ratio > 0; 0 gives -infinity).
  static Decibels of_ratio(double amplitude_ratio) {
    return Decibels(20.0 * std::log10(amplitude_ratio));
  }
  double ratio() const { return std::pow(10.0, value_ / 20.0); }

  friend constexpr Decibels operator+(Decibels a, Decibels b) {
    return Decibels(a.value_ + b.value_);
  }
  friend constexpr Decibels operator-(Decibels a, Decibels b) {
    return Decibels(a.value_ - b.value_);
  }
  friend constexpr Decibels operator-(Decibels a) { return Decibels(-a.value_); }
  friend constexpr Decibels operator*(double k, Decibels a) { return Decibels(k * a.value_); }
  friend constexpr auto operator<=>(Decibels, Decibels) = default;

 private:
  double value_ = 0.0;
};

/// A level above the reference that `Reference` names.
template <class Reference>
class Level {
 public:
  constexpr Level() = default;
  constexpr explicit Level(double value) : value_(value) {}
  constexpr double value() const { return value_; }

  friend constexpr Level operator+(Level a, Decibels g) { return Level(a.value_ + g.value()); }
  friend constexpr Level operator-(Level a, Decibels g) { return Level(a.value_ - g.value()); }
  friend constexpr Decibels operator-(Level a, Level b) { return Decibels(a.value_ - b.value_); }
  friend constexpr auto operator<=>(Level, Level) = default;

 private:
  double value_ = 0.0;
};

using LevelDbu = Level<struct DbuReference>;
using LevelDbv = Level<struct DbvReference>;
using LevelDbfs = Level<struct DbfsReference>;

/// sqrt(0.6) V: the voltage of 1 mW in 600 ohm.
inline const VoltsRms kZeroDbu{std::sqrt(0.6)};
inline constexpr VoltsRms kZeroDbv{1.0};

inline LevelDbu to_dbu(VoltsRms v) { return LevelDbu(20.0 * std::log10(v / kZeroDbu)); }
inline LevelDbv to_dbv(VoltsRms v) { return LevelDbv(20.0 * std::log10(v / kZeroDbv)); }
inline VoltsRms to_volts(LevelDbu l) { return kZeroDbu * std::pow(10.0, l.value() / 20.0); }
inline VoltsRms to_volts(LevelDbv l) { return kZeroDbv * std::pow(10.0, l.value() / 20.0); }

/// Peak of a sine of that rms value.
constexpr VoltsPeak sine_peak(VoltsRms v) { return VoltsPeak(v.value() * std::numbers::sqrt2); }
constexpr VoltsRms sine_rms(VoltsPeak v) { return VoltsRms(v.value() / std::numbers::sqrt2); }

/// Peak sample value (full scale = 1) of a sine at that level.
inline double sine_peak(LevelDbfs l) { return std::pow(10.0, l.value() / 20.0); }

}  // namespace kneeprint
