// SPDX-License-Identifier: GPL-3.0-or-later
#include "quantity/uncertain.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <array>
#include <boost/math/distributions/students_t.hpp>
#include <cmath>

namespace kneeprint {

TEST_CASE("coverage factors are the 0.975 quantiles of Student's t") {
  // NIST/SEMATECH e-Handbook of Statistical Methods, table of critical values of t, to six
  // decimals.
  const struct {
    double dof, t;
  } rows[] = {{1, 12.706205}, {2, 4.302653},  {3, 3.182446},  {4, 2.776445},  {5, 2.570582},
              {9, 2.262157},  {10, 2.228139}, {15, 2.131450}, {20, 2.085963}, {30, 2.042272},
              {40, 2.021075}, {60, 2.000298}, {120, 1.979930}};
  for (const auto& row : rows) {
    CAPTURE(row.dof);
    CHECK(std::abs(coverage_factor_95(row.dof) - row.t) < 1e-6);
  }
  CHECK(std::abs(coverage_factor_95(kInfiniteDof) - 1.959964) < 1e-6);
  // Both sides of the switch to the limit: t exceeds it by (z^3 + z) / (4 dof), here 2e-9.
  CHECK(std::abs(coverage_factor_95(0.99e9) - coverage_factor_95(1.01e9)) < 1e-8);
  // Effective degrees of freedom are seldom whole.
  CHECK(coverage_factor_95(15.5) < coverage_factor_95(15.0));
  CHECK(coverage_factor_95(15.5) > coverage_factor_95(16.0));
}

TEST_CASE("coverage factors at any degrees of freedom are Boost's quantiles to 1e-13") {
  double worst = 0.0;
  for (double dof = 1.0; dof < 1e9; dof *= 1.013) {
    const double exact = boost::math::quantile(boost::math::students_t(dof), 0.975);
    worst = std::max(worst, std::abs(coverage_factor_95(dof) / exact - 1.0));
  }
  CHECK(worst < 1e-13);
}

TEST_CASE("the expanded uncertainty is the factor times u") {
  CHECK(expanded_95({1.0, 0.5, 4.0}) == doctest::Approx(0.5 * 2.776445).epsilon(1e-6));
  CHECK(expanded_95({1.0, 0.0, 4.0}) == 0.0);
}

TEST_CASE("contributions combine with the Welch-Satterthwaite degrees of freedom") {
  // JCGM 100:2008 eq. G.2b by hand: 0.0014^2 / (0.02^4/4 + 0.03^4/9) = 15.0769.
  const std::array parts{Contribution{0.02, 4.0}, Contribution{0.03, 9.0}, Contribution{0.01}};
  const Contribution all = combine(parts);
  CHECK(all.u == doctest::Approx(0.0374165739).epsilon(1e-9));
  CHECK(all.dof == doctest::Approx(15.0769).epsilon(1e-5));
  // With the degrees of freedom cut to whole ones, as the GUM does: 0.0797515394.
  CHECK(expanded_95({0.0, all.u, std::floor(all.dof)}) ==
        doctest::Approx(0.0797515394).epsilon(1e-6));
}

TEST_CASE("one contribution stays itself; none, or only known ones, have infinite dof") {
  const std::array one{Contribution{0.3, 7.0}};
  CHECK(combine(one).u == doctest::Approx(0.3).epsilon(1e-15));
  CHECK(combine(one).dof == doctest::Approx(7.0).epsilon(1e-14));
  CHECK(combine({}).u == 0.0);
  CHECK(combine({}).dof == kInfiniteDof);
  const std::array zero{Contribution{0.0, 3.0}, Contribution{0.0, 5.0}};
  CHECK(combine(zero).u == 0.0);
  CHECK(combine(zero).dof == kInfiniteDof);
  const std::array known{Contribution{3.0}, Contribution{4.0}};
  CHECK(combine(known).u == doctest::Approx(5.0).epsilon(1e-15));
  CHECK(combine(known).dof == kInfiniteDof);
}

TEST_CASE("amplitudes far below any signal do not spoil the degrees of freedom") {
  const std::array tiny{Contribution{1e-90, 4.0}, Contribution{1e-90, 4.0}};
  CHECK(combine(tiny).u == doctest::Approx(std::sqrt(2.0) * 1e-90).epsilon(1e-12));
  CHECK(combine(tiny).dof > 0.0);  // 1e-360 underflows to zero: infinite rather than no number
}

}  // namespace kneeprint
