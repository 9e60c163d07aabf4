// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/median.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <random>
#include <vector>

namespace kneeprint {

TEST_CASE("the upper median is what sorting puts in the middle") {
  std::mt19937_64 random(5);
  for (std::size_t size = 1; size <= 200; ++size) {
    CAPTURE(size);
    std::vector<double> values(size);
    // Few different values, so that many are equal; then all different.
    for (const int kinds : {1, 3, 1000000}) {
      for (double& v : values) v = static_cast<double>(random() % static_cast<unsigned>(kinds));
      std::vector<double> sorted = values;
      std::sort(sorted.begin(), sorted.end());
      CHECK(upper_median(values) == sorted[size / 2]);
      std::sort(values.begin(), values.end());
      CHECK(values == sorted);  // rearranged, nothing lost
    }
  }
}

TEST_CASE("values that are no numbers do not keep it from ending") {
  constexpr double kNothing = std::numeric_limits<double>::quiet_NaN();
  std::vector<double> all(9, kNothing), some{1.0, kNothing, 2.0, kNothing, 3.0};
  CHECK(std::isnan(upper_median(all)));
  upper_median(some);
  CHECK(std::count_if(some.begin(), some.end(), [](double x) { return std::isnan(x); }) == 2);
}

}  // namespace kneeprint
