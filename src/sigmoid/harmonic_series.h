// SPDX-License-Identifier: GPL-3.0-or-later
// Harmonics of a biased sigmoid under a sine, with their derivatives, to a stated accuracy: what the
// fit calls some hundred thousand times.
//
// H_n are the cosine coefficients (signed peaks) of S(drive A cos theta + bias) - S(bias), the limit
// being 1, by the periodic trapezoid rule (Trefethen & Weideman, SIAM Review 56(3) 2014). Points per
// period double, each doubling reusing the points before, until H_0 .. H_orders change by less than
// the tolerance. The change bounds the aliasing that was in the coarser rule; what is left in the
// finer one is about the square of it for tanh, atan and erf, and a seventh of it or less for the
// algebraic family, whose worst corner (p = 1) has errors falling with the cube of the points.
#pragma once

#include <vector>

#include "sigmoid/family.h"

namespace kneeprint {

/// Index n is order n.
struct HarmonicSet {
  std::vector<double> value;
  std::vector<double> by_drive, by_bias, by_sharpness;  ///< dH_n/d(parameter), when asked for
};

class HarmonicSeries {
 public:
  /// orders >= 1.
  explicit HarmonicSeries(int orders);

  /// The limit in `p` is not used. `tolerance` is relative to the smaller of the limit (1) and
  /// drive * amplitude; at 65536 points per period it ends in any case.
  void evaluate(const SigmoidFamily& family, const SigmoidParameters& p, double amplitude,
                double tolerance, bool derivatives, HarmonicSet& result);

 private:
  // The points that one doubling adds: cosines of order 0 .. orders+1, point by point.
  struct Level {
    std::vector<double> weights;
    std::vector<double> cosines;
  };
  const Level& level(std::size_t index);
  void add(const SigmoidFamily& family, const SigmoidParameters& p, double amplitude,
           bool derivatives, const Level& level);

  std::size_t orders_;
  std::size_t width_;  // orders_ + 2: slopes are wanted one order further
  int coarsest_;       // points per period at level 0
  std::vector<Level> levels_;
  std::vector<double> value_sums_, slope_sums_, sharpness_sums_;
};

}  // namespace kneeprint
