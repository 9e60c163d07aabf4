// SPDX-License-Identifier: GPL-3.0-or-later
// A value with its standard uncertainty and degrees of freedom, after the GUM (JCGM 100:2008).
#pragma once

#include <limits>
#include <span>

namespace kneeprint {

inline constexpr double kInfiniteDof = std::numeric_limits<double>::infinity();

struct Uncertain {
  double value = 0.0;
  double u = 0.0;             ///< standard uncertainty, same unit as value, >= 0
  double dof = kInfiniteDof;  ///< effective degrees of freedom, > 0
};

/// Two-sided 95 % coverage factor: the 0.975 quantile of Student's t (JCGM 100:2008 G.3).
/// dof > 0, may be infinite (1.959964).
double coverage_factor_95(double dof);

/// Expanded uncertainty at 95 %: coverage factor times u.
double expanded_95(const Uncertain& x);

/// One uncorrelated contribution to a combined uncertainty, already multiplied by its sensitivity.
struct Contribution {
  double u = 0.0;
  double dof = kInfiniteDof;
};

/// Root sum of squares (JCGM 100:2008 eq. 10) with the Welch-Satterthwaite degrees of freedom
/// (JCGM 100:2008 eq. G.2b). No contribution, or all zero: u = 0 and infinite dof.
Contribution combine(std::span<const Contribution> parts);

}  // namespace kneeprint
