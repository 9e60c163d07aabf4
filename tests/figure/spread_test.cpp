// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/spread.h"

#include "doctest/doctest.h"

namespace kneeprint {
namespace {

TEST_CASE("labels with room stay where they are") {
  CHECK(spread_labels({50.0, 10.0, 90.0}, 12.0, 0.0, 100.0) ==
        std::vector<double>{50.0, 10.0, 90.0});
  CHECK(spread_labels({}, 12.0, 0.0, 100.0).empty());
}

TEST_CASE("equal wishes are spread about their mean: the least-squares answer") {
  const auto p = spread_labels({40.0, 40.0, 40.0}, 10.0, 0.0, 100.0);
  CHECK(p == std::vector<double>{30.0, 40.0, 50.0});
}

TEST_CASE("order follows the wishes, gaps hold, ends are kept") {
  const std::vector<double> wanted = {2.0, 1.0, 98.0, 99.0, 97.0, 50.0};
  const auto p = spread_labels(wanted, 12.0, 0.0, 100.0);
  CHECK(p[1] == 0.0);
  CHECK(p[0] == 12.0);
  CHECK(p[3] == 100.0);
  CHECK(p[2] == 88.0);
  CHECK(p[4] == 76.0);
  CHECK(p[5] == 50.0);
}

TEST_CASE("where there is no room the gap shrinks and nothing leaves the column") {
  const auto p = spread_labels(std::vector<double>(6, 5.0), 12.0, 0.0, 10.0);
  for (std::size_t i = 0; i < p.size(); ++i)
    CHECK(p[i] == doctest::Approx(2.0 * static_cast<double>(i)));
}

}  // namespace
}  // namespace kneeprint
