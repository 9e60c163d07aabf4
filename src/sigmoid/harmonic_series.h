// SPDX-License-Identifier: GPL-3.0-or-later
// Harmonics of a biased sigmoid under a sine, with their derivatives, to a stated accuracy: what
// the fit calls some hundred thousand times.
//
// H_n are the cosine coefficients (signed peaks) of S(drive A cos theta + bias) - S(bias), the
// limit being 1. First by the periodic trapezoid rule (Trefethen & Weideman, SIAM Review 56(3)
// 2014), doubled until H_0 .. H_orders change by less than the tolerance, each doubling reusing the
// points before. That is quick unless the sigmoid's centre is crossed steeply, or has a corner in
// some derivative (algebraic, p not even): then by Gauss-Legendre rules on either side of the
// crossing, which crowd their points where it is, doubled in the same way. What is left is a small
// part of the last change: about its square where S is analytic, a 2^(2p+4)th beside a corner.
#pragma once

#include <cstddef>
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
  /// drive * amplitude; doubling ends in any case at 1024 points a side, or, where nothing is
  /// crossed, at 65536 a period.
  void evaluate(const SigmoidFamily& family, const SigmoidParameters& p, double amplitude,
                double tolerance, bool derivatives, HarmonicSet& result);

 private:
  /// Points of a rule for the mean over half a period: cosines of order 0 .. orders+1 point by
  /// point.
  struct Points {
    std::vector<double> weights;
    std::vector<double> cosines;
  };
  struct GaussRule {
    std::vector<double> nodes, weights;  // on -1 .. 1
  };
  struct Curve {
    const SigmoidFamily& family;
    const SigmoidParameters& p;
    double swing;  // drive * amplitude
  };

  const Points& trapezoid_points(std::size_t doublings);
  const GaussRule& gauss_rule(std::size_t doublings);
  /// Into gauss_points_: the rule on either side of theta = crossing.
  void place_gauss_points(const GaussRule& rule, double crossing);

  bool by_trapezoid(const Curve& curve, double wanted, int most_points);
  void by_gauss(const Curve& curve, double wanted);
  void add_values(const Curve& curve, const Points& points);
  void add_derivatives(const Curve& curve, const Points& points);
  /// Coefficients from the sums into value_; the largest change of one.
  double update(double scale);

  std::size_t orders_;
  std::size_t width_;               // orders_ + 2: slopes are wanted one order further
  int coarsest_;                    // points per period of the first trapezoid rule
  std::vector<Points> trapezoids_;  // the points that each doubling adds
  std::size_t used_trapezoids_ = 0;
  std::vector<GaussRule> rules_;
  Points gauss_points_;
  std::vector<double> value_sums_, slope_sums_, sharpness_sums_, value_;
};

}  // namespace kneeprint
