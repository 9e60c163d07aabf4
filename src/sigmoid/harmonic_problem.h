// SPDX-License-Identifier: GPL-3.0-or-later
// The harmonics of all drives as one least-squares problem for one family.
//
// Residual of a datum: (H_n(model) - value) / sqrt(u^2 + (d D)^2), magnitudes compared where the
// datum has no sign; d is the discrepancy and D the measured distortion at that drive (see fit.h).
//
// The limit, in which the curve is linear, is eliminated: each shape (ln drive, bias and, where the
// family has it, ln sharpness) comes with its best limit, and the search is over shapes alone
// (variable projection: Golub & Pereyra, SIAM J. Numer. Anal. 10 (1973) 413; Jacobian after
// Kaufman, BIT 15 (1975) 49). Without that the search creeps along a bent valley of equal gain when
// the unit hardly saturates.
#pragma once

#include <optional>
#include <span>
#include <vector>

#include "sigmoid/fit.h"
#include "sigmoid/harmonic_series.h"
#include "sigmoid/least_squares.h"

namespace kneeprint {

/// The data, by drive.
class HarmonicData {
 public:
  explicit HarmonicData(const std::vector<FitDatum>& data);

  struct Rung {
    double input_peak = 0.0;
    double fundamental = 0.0;  ///< magnitude; the largest |value| where none was measured
    double distortion = 0.0;   ///< rss of orders 2 and up; the fundamental where none was measured
    std::vector<FitDatum> data;

    double sigma(const FitDatum& d, double discrepancy) const;  ///< sqrt(u^2 + (d D)^2)
  };
  const std::vector<Rung>& rungs() const { return rungs_; }  ///< ascending input
  int size() const { return size_; }
  int orders() const { return orders_; }  ///< the highest
  double strongest_input() const { return rungs_.back().input_peak; }
  /// Largest distortion of any drive, relative to the largest fundamental.
  double largest_distortion() const;
  /// Smallest sigma, relative to the largest fundamental.
  double smallest_sigma(double discrepancy) const;
  /// Sum of ln sigma^2.
  double log_variances(double discrepancy) const;

 private:
  std::vector<Rung> rungs_;
  int size_ = 0, orders_ = 1;
};

using Shape = std::vector<double>;  ///< ln drive, bias, ln sharpness

class HarmonicProblem {
 public:
  /// Both must outlive it.
  HarmonicProblem(const HarmonicData& data, const SigmoidFamily& family);

  /// Over shapes. The quadrature is accurate to a thousandth of the smallest uncertainty. The
  /// result refers to this object.
  LeastSquaresProblem over_shapes(double discrepancy);
  /// Over ln limit and the shape: for standard errors.
  LeastSquaresProblem over_all(double discrepancy);

  /// The shape with its best limit.
  SigmoidParameters parameters(const Shape& shape, double discrepancy);
  /// Whether the family has degenerated there: drive or bias at the end of its range, or rest on
  /// the sigmoid's flat end.
  bool degenerate(const Shape& shape) const;
  /// Fair starting points, the fairest first: the best drives of a grid, one for each bias of
  /// either sign, or, for a family with sharpness, one for each sharpness and sign.
  std::vector<Shape> starts(double discrepancy);

 private:
  struct GridPoint {
    Shape shape;                    // bias >= 0
    std::vector<double> harmonics;  // one per datum, limit 1
  };
  struct Candidate {
    double sum_of_squares;
    Shape shape;
  };
  /// Both over their sigma, the values positive where they have no sign: what the model says for
  /// limit 1, with its derivatives by the shape row by row unless `jacobian` is empty.
  std::vector<double> scaled_values(double discrepancy) const;
  void scaled_model(double discrepancy, std::span<const double> shape, std::span<double> model,
                    std::span<double> jacobian);
  SigmoidParameters unit_limit(std::span<const double> shape) const;
  double slope_at_rest(std::span<const double> shape) const;
  const std::vector<GridPoint>& grid();
  std::optional<Candidate> candidate(const GridPoint& point, bool negative,
                                     double discrepancy) const;

  const HarmonicData& data_;
  const SigmoidFamily& family_;
  HarmonicSeries series_;
  HarmonicSet set_;
  Shape low_, high_;
  std::vector<GridPoint> grid_;  // evaluated once
};

}  // namespace kneeprint
