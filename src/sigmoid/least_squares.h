// SPDX-License-Identifier: GPL-3.0-or-later
// Non-linear least squares with a given Jacobian: Levenberg-Marquardt with dense QR (Ceres Solver),
// and the inverse Fisher matrix for standard errors. Knows nothing of sigmoids.
#pragma once

#include <functional>
#include <span>
#include <vector>

namespace kneeprint {

struct LeastSquaresProblem {
  int residuals = 0;  ///< at least `parameters`
  int parameters = 0;
  /// Fills r (size `residuals`) and, unless it is empty, the Jacobian dr_i/dx_j row by row. False
  /// where x has no value; such a step is not taken.
  std::function<bool(std::span<const double> x, std::span<double> r, std::span<double> jacobian)>
      evaluate;
  /// Bounds of each parameter; both empty: none.
  std::vector<double> low = {}, high = {};
};

struct LeastSquaresOptions {
  int most_iterations = 500;
  /// Ends when a step changes the sum of squares by less than this share, or a parameter by less
  /// than this share of the parameters' norm.
  double tolerance = 1e-15;
};

struct LeastSquaresSolution {
  std::vector<double> x;
  double sum_of_squares = 0.0;
  bool converged = false;  ///< by a tolerance, not by running out of iterations
};

/// From `start`, moved inside the bounds where it is not. A start without a value comes back as it
/// is, with an infinite sum of squares and not converged.
LeastSquaresSolution least_squares(const LeastSquaresProblem& problem, std::vector<double> start,
                                   const LeastSquaresOptions& options = {});

/// (J^T J)^-1 at x, row by row (parameters x parameters): the covariance of the parameters when
/// every residual has unit variance. From the singular values of J with its columns scaled to unit
/// length, so parameters of any size mix. Directions that the data do not see (below 1e-12 of the
/// strongest after scaling) get that ratio's variance: large, finite, never NaN.
std::vector<double> inverse_fisher(const LeastSquaresProblem& problem, std::span<const double> x);

}  // namespace kneeprint
