// SPDX-License-Identifier: GPL-3.0-or-later
// Physical quantities as types: a frequency is never a number, and never a time.
// Construction is explicit, a quantity adds only to its own kind, and a ratio of two is a plain
// number. Shape: one double. Errors: none (arithmetic follows IEEE 754).
#pragma once

#include <compare>

namespace kneeprint {

template <class Tag>
class Quantity {
 public:
  constexpr Quantity() = default;
  constexpr explicit Quantity(double value) : value_(value) {}
  constexpr double value() const { return value_; }

  friend constexpr Quantity operator+(Quantity a, Quantity b) {
    return Quantity(a.value_ + b.value_);
  }
  friend constexpr Quantity operator-(Quantity a, Quantity b) {
    return Quantity(a.value_ - b.value_);
  }
  friend constexpr Quantity operator-(Quantity a) { return Quantity(-a.value_); }
  friend constexpr Quantity operator*(Quantity a, double k) { return Quantity(a.value_ * k); }
  friend constexpr Quantity operator*(double k, Quantity a) { return Quantity(a.value_ * k); }
  friend constexpr Quantity operator/(Quantity a, double k) { return Quantity(a.value_ / k); }
  friend constexpr double operator/(Quantity a, Quantity b) { return a.value_ / b.value_; }
  friend constexpr auto operator<=>(Quantity, Quantity) = default;

 private:
  double value_ = 0.0;
};

using Hertz = Quantity<struct HertzTag>;
using Seconds = Quantity<struct SecondsTag>;
using Ohms = Quantity<struct OhmsTag>;
using VoltsRms = Quantity<struct VoltsRmsTag>;    ///< root mean square; never mixed with a peak
using VoltsPeak = Quantity<struct VoltsPeakTag>;  ///< crest of the waveform

/// Cycles of `f` in `t`.
constexpr double cycles(Hertz f, Seconds t) { return f.value() * t.value(); }
constexpr Seconds period(Hertz f) { return Seconds(1.0 / f.value()); }

}  // namespace kneeprint
