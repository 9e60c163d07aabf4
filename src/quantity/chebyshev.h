// SPDX-License-Identifier: GPL-3.0-or-later
// A smooth function of one variable kept as its values at Chebyshev points: what costs microseconds
// to evaluate (an inverse distribution function) then costs some tens of nanoseconds, without loss.
#pragma once

#include <cstddef>
#include <functional>
#include <vector>

namespace kneeprint {

class ChebyshevCurve {
 public:
  /// Samples `f` at points + 1 Chebyshev points of [low, high], ends included. low < high, points
  /// >= 2. The error falls geometrically with `points` where f is analytic on the interval and
  /// beyond.
  ChebyshevCurve(const std::function<double(double)>& f, double low, double high,
                 std::size_t points);

  double low() const { return x_.back(); }
  double high() const { return x_.front(); }
  /// Interpolates; low <= x <= high.
  double operator()(double x) const;

 private:
  std::vector<double> x_, y_, weight_;  // x descending
};

}  // namespace kneeprint
