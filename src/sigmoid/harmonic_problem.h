// SPDX-License-Identifier: GPL-3.0-or-later
// The harmonics of all drives as one least-squares problem for one family.
//
// Residual of a datum: (H_n(model) - value) / sqrt(u^2 + (d |H1|)^2), magnitudes compared where the
// datum has no sign; d is the discrepancy (see fit.h) and H1 the measured fundamental at that drive.
// Fitted are ln limit, ln drive, bias and, where the family has it, ln sharpness.
#pragma once

#include <span>
#include <vector>

#include "sigmoid/fit.h"
#include "sigmoid/harmonic_series.h"
#include "sigmoid/least_squares.h"

namespace kneeprint {

/// The data, by drive, with the fundamental that scales the discrepancy. Largest |value| of the drive
/// where its fundamental is missing.
class HarmonicData {
 public:
  explicit HarmonicData(const std::vector<FitDatum>& data);

  struct Rung {
    double input_peak = 0.0;
    double fundamental = 0.0;  ///< magnitude
    std::vector<FitDatum> data;
  };
  const std::vector<Rung>& rungs() const { return rungs_; }
  int size() const { return size_; }
  int orders() const { return orders_; }  ///< the highest
  double strongest_input() const { return rungs_.back().input_peak; }
  /// Largest harmonic above the first, relative to the fundamental of its drive.
  double largest_harmonic() const;
  double smallest_u() const;          ///< relative to the largest fundamental
  double log_variances(double discrepancy) const;  ///< sum of ln(u^2 + (d H1)^2)

 private:
  std::vector<Rung> rungs_;  // ascending input
  int size_ = 0, orders_ = 1;
};

using Fitted = std::vector<double>;  ///< ln limit, ln drive, bias, ln sharpness

class HarmonicProblem {
 public:
  /// Both must outlive it.
  HarmonicProblem(const HarmonicData& data, const SigmoidFamily& family);

  /// `accuracy` of the quadrature, see HarmonicSeries. The result refers to this object.
  LeastSquaresProblem at(double discrepancy, double accuracy);
  SigmoidParameters parameters(std::span<const double> x) const;
  /// Whether the family has degenerated there: drive or bias at the end of its range.
  bool degenerate(std::span<const double> x) const;
  /// Fair starting points: the best of a grid over drive, bias of both signs and sharpness, each with
  /// its best limit (in which the curve is linear).
  std::vector<Fitted> starts(double discrepancy);

 private:
  bool evaluate(double discrepancy, double accuracy, std::span<const double> x, std::span<double> r,
                std::span<double> jacobian);

  const HarmonicData& data_;
  const SigmoidFamily& family_;
  HarmonicSeries series_;
  HarmonicSet set_;
  Fitted low_, high_;
};

}  // namespace kneeprint
