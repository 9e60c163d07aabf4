// SPDX-License-Identifier: GPL-3.0-or-later
// Harmonics of a family's curve at every drive of the data, with their derivatives by limit, drive,
// bias and sharpness.
#pragma once

#include <vector>

#include "sigmoid/fit.h"

namespace kneeprint {

/// Harmonic of one datum and its derivatives.
struct ModelledHarmonic {
  double value = 0.0;  ///< signed peak
  double by_limit = 0.0, by_drive = 0.0, by_bias = 0.0, by_sharpness = 0.0;
};

class HarmonicModel {
 public:
  /// `points`: quadrature points per half period (the response to a cosine is even in time, so half
  /// a period holds it all); midpoint rule, which converges geometrically for analytic curves
  /// (Trefethen & Weideman, SIAM Review 56(3) 2014).
  HarmonicModel(const std::vector<FitDatum>& data, int points);

  /// One per datum, in the order of the data.
  std::vector<ModelledHarmonic> evaluate(const SigmoidFamily& family,
                                         const SigmoidParameters& p) const;

 private:
  struct Group {  // the data of one drive
    double amplitude;
    std::vector<std::size_t> data;
  };
  const std::vector<FitDatum>& data_;
  int points_;
  std::vector<Group> groups_;
  std::vector<double> nodes_;                 // cos theta_k
  std::vector<std::vector<double>> cosines_;  // by order: weight * cos(n theta_k)
};

}  // namespace kneeprint
