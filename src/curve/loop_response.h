// SPDX-License-Identifier: GPL-3.0-or-later
// The linear response of the rig: send and return in a loop, a cable in place of the unit.
//
// A loop gives the product of the two. A fundamental that went through both is divided by the
// product; a harmonic arose in the unit and went through the return alone, so it is divided by the
// return's share. Where the split is unknown each is taken as the square root of the product, and
// the possible rest, from none to all of it, is a rectangular term (JCGM 100:2008, 4.3.7): half the
// product's decibels over sqrt 3.
#pragma once

#include <complex>
#include <optional>
#include <vector>

#include "quantity/level.h"

namespace kneeprint {

struct LoopPoint {
  Hertz frequency;
  Decibels magnitude;      ///< relative to the reference frequency of the full-scale voltages
  double phase_deg = 0.0;  ///< the loop's delay taken out
};

class LoopResponse {
 public:
  LoopResponse() = default;  ///< unknown: 1 everywhere, without doubt stated
  /// Sorted by itself; frequencies > 0, each once. `return_share`: how much of the product's
  /// decibels and degrees belongs to the return, 0 .. 1, where that is known.
  explicit LoopResponse(std::vector<LoopPoint> points, std::optional<double> return_share = {});

  struct Share {
    std::complex<double> response{1.0, 0.0};
    Decibels u{0.0};  ///< standard uncertainty of its magnitude from the unknown split
  };
  /// Linear in decibels and degrees over log frequency; beyond the ends, the end's value.
  std::complex<double> loop(Hertz f) const;
  Share send(Hertz f) const;
  Share ret(Hertz f) const;
  /// ret(f) over ret(reference), whose doubts are one and the same split.
  Share ret_ratio(Hertz f, Hertz reference) const;

  const std::vector<LoopPoint>& points() const { return points_; }
  std::optional<double> return_share() const { return return_share_; }
  bool known() const { return !points_.empty(); }

 private:
  LoopPoint at(Hertz f) const;
  Share share_of(const LoopPoint& p, double share) const;

  std::vector<LoopPoint> points_;
  std::optional<double> return_share_;
};

}  // namespace kneeprint
