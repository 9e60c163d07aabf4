// SPDX-License-Identifier: GPL-3.0-or-later
#include "quantity/uncertain.h"

#include <boost/math/distributions/students_t.hpp>
#include <cmath>

#include "quantity/chebyshev.h"

namespace kneeprint {

double coverage_factor_95(double dof) {
  constexpr double kNormalQuantile = 1.959963984540054;  // limit for infinite dof
  constexpr double kFewest = 2.0;
  const auto exact = [](double nu) {
    return boost::math::quantile(boost::math::students_t(nu), 0.975);
  };
  if (!(dof < 1e9)) return kNormalQuantile;
  if (dof < kFewest) return exact(dof);
  // The quantile is smooth in 1 / dof down to the normal distribution at 0; 28 points hold it to
  // the last bits (tests/quantity/uncertain_test.cpp).
  static const ChebyshevCurve curve(
      [&](double x) { return x > 1e-9 ? exact(1.0 / x) : kNormalQuantile; }, 0.0, 1.0 / kFewest,
      28);
  return curve(1.0 / dof);
}

double expanded_95(const Uncertain& x) { return coverage_factor_95(x.dof) * x.u; }

Contribution combine(std::span<const Contribution> parts) {
  double sum_squares = 0.0;
  double sum_fourths_over_dof = 0.0;
  for (const Contribution& part : parts) {
    const double square = part.u * part.u;
    sum_squares += square;
    sum_fourths_over_dof += square * square / part.dof;
  }
  // Squares of the tiniest amplitudes underflow in the fourth power: then dof is as good as
  // infinite.
  const double dof =
      sum_fourths_over_dof > 0.0 ? sum_squares * sum_squares / sum_fourths_over_dof : kInfiniteDof;
  return {std::sqrt(sum_squares), dof};
}

}  // namespace kneeprint
