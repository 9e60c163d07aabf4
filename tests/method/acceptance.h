// SPDX-License-Identifier: GPL-3.0-or-later
// What random repeats may show before a test fails, so chosen that a right program fails some check
// of the whole family with a chance below 0.1 % (Bonferroni: the sum of the checks' own chances).
#pragma once

#include <fmt/format.h>

#include <algorithm>
#include <boost/math/distributions/binomial.hpp>
#include <boost/math/distributions/chi_squared.hpp>
#include <cmath>
#include <cstdlib>
#include <string>
#include <string_view>

namespace kneeprint::testing {

/// KNEEPRINT_LONG=1 asks for the long forms (tests/long.sh).
inline bool long_form() {
  const char* value = std::getenv("KNEEPRINT_LONG");
  return value != nullptr && std::string_view(value) == "1";
}
inline int repeats(int in_ci, int long_one) { return long_form() ? long_one : in_ci; }

inline constexpr double kFamilyChance = 1e-3;
/// At least as many as there are random checks in the family; a right program fails one of them
/// with a chance of kCheckChance at most, so any of them with at most their sum, kFamilyChance:
///   coverage_test.cpp: 11 figures in 3 kinds of noise (33), near the noise (26), at the floor (11)
///   efficiency_test.cpp: the scatter of H1 .. H5 (5)
inline constexpr int kFamilyChecks = 80;
inline constexpr double kCheckChance = kFamilyChance / kFamilyChecks;

/// What a right program's intervals cover. Not 0.95 exactly: a residual of known amplitude is no
/// normal variate though it is combined as one (measuring it as u = a / sqrt 2 covers a little
/// more), effective degrees of freedom are an approximation, and so is the allowance for hum.
inline constexpr double kRightLeast = 0.945, kRightMost = 0.960;

inline double chance_below(int n, double p, int least) {
  return least > 0 ? cdf(boost::math::binomial(n, p), least - 1) : 0.0;
}
inline double chance_above(int n, double p, int most) {
  return most < n ? cdf(complement(boost::math::binomial(n, p), most)) : 0.0;
}

/// How many of `n` repeats must and may be covered, and the chance that a right program errs.
struct AcceptedCounts {
  int least = 0, most = 0;
  double chance = 0.0;
};

/// The long form's bounds are given: 93 to 97 %. With 2000 repeats a right program would leave them
/// with 4e-5 (coverage 95 %) to 8e-3 (96 %) per figure, too much for 33 figures; with 8000 the
/// chance is below 1e-6 at both ends of what is right. The
/// short form has the bounds that leave half of kCheckChance on either side.
inline AcceptedCounts accepted_coverage(int n) {
  AcceptedCounts out{0, n, 0.0};
  if (long_form()) {
    out.least = static_cast<int>(std::ceil(0.93 * n - 1e-9));
    out.most = static_cast<int>(std::floor(0.97 * n + 1e-9));
  } else {
    while (chance_below(n, kRightLeast, out.least + 1) <= kCheckChance / 2.0) ++out.least;
    while (chance_above(n, kRightMost, out.most - 1) <= kCheckChance / 2.0) --out.most;
  }
  out.chance =
      std::max(chance_below(n, kRightLeast, out.least) + chance_above(n, kRightLeast, out.most),
               chance_below(n, kRightMost, out.least) + chance_above(n, kRightMost, out.most));
  return out;
}

/// One-sided: what covers at least as much as kRightLeast, however much more.
inline AcceptedCounts accepted_at_least(int n) {
  AcceptedCounts out{0, n, 0.0};
  while (chance_below(n, kRightLeast, out.least + 1) <= kCheckChance) ++out.least;
  out.chance = chance_below(n, kRightLeast, out.least);
  return out;
}

/// Bounds on the ratio of a standard deviation seen with `dof` degrees of freedom to the true one.
struct AcceptedRatio {
  double least = 0.0, most = 0.0, chance = 0.0;
};

inline AcceptedRatio accepted_deviation(double dof) {
  const boost::math::chi_squared squares(dof);
  return {std::sqrt(quantile(squares, kCheckChance / 2.0) / dof),
          std::sqrt(quantile(complement(squares, kCheckChance / 2.0)) / dof), kCheckChance};
}

/// The chance that such a ratio leaves 1 -+ `share`.
inline double chance_of_deviation(double dof, double share) {
  const boost::math::chi_squared squares(dof);
  return cdf(squares, dof * (1.0 - share) * (1.0 - share)) +
         cdf(complement(squares, dof * (1.0 + share) * (1.0 + share)));
}

/// Printed by the long forms, one line per check.
inline void report(const std::string& line) {
  if (long_form()) fmt::print("{}\n", line);
}

}  // namespace kneeprint::testing
