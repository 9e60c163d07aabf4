// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/ticks.h"

#include <algorithm>
#include <cmath>

#include "doctest/doctest.h"

namespace kneeprint {
namespace {

std::vector<std::string> labels(const std::vector<Tick>& ticks) {
  std::vector<std::string> texts;
  for (const auto& t : ticks)
    if (!t.label.empty()) texts.push_back(t.label);
  return texts;
}

TEST_CASE("steps are 1, 2 or 5 times a power of ten and no more gaps than asked") {
  CHECK(tick_step(60.0, 6) == 10.0);
  CHECK(tick_step(60.0, 7) == 10.0);
  CHECK(tick_step(70.0, 6) == 20.0);
  CHECK(tick_step(0.3, 10) == doctest::Approx(0.05));
  for (double span = 1e-4; span < 1e5; span *= 1.37)
    for (int most : {3, 6, 11}) {
      const double step = tick_step(span, most);
      const double mantissa = step / std::pow(10.0, std::floor(std::log10(step) + 1e-9));
      const bool round = std::abs(mantissa - 1) < 1e-9 || std::abs(mantissa - 2) < 1e-9 ||
                         std::abs(mantissa - 5) < 1e-9;
      CHECK(round);
      CHECK(span / step <= most * (1.0 + 1e-6));
    }
}

TEST_CASE("linear ticks carry clean labels, both ends included") {
  CHECK(labels(linear_ticks(-60.0, 0.0, 6)) ==
        std::vector<std::string>{"\u221260", "\u221250", "\u221240", "\u221230", "\u221220",
                                 "\u221210", "0"});
  CHECK(labels(linear_ticks(-0.1, 0.1, 4)) ==
        std::vector<std::string>{"\u22120.1", "\u22120.05", "0", "0.05", "0.1"});
  CHECK(labels(linear_ticks(0.0, 0.3, 6)) ==
        std::vector<std::string>{"0", "0.05", "0.1", "0.15", "0.2", "0.25", "0.3"});
}

TEST_CASE("ticks ascend and stay within the axis; minor ones lie between") {
  for (const auto& ticks : {linear_ticks(-37.3, 22.8, 7), log_ticks(0.0007, 31.0, 8)}) {
    CHECK(std::is_sorted(ticks.begin(), ticks.end(),
                         [](const Tick& a, const Tick& b) { return a.at < b.at; }));
    CHECK(labels(ticks).size() >= 3);
    CHECK(labels(ticks).size() < ticks.size());
  }
  CHECK(linear_ticks(-37.3, 22.8, 7).front().at >= -37.3);
  CHECK(log_ticks(0.0007, 31.0, 8).front().at == doctest::Approx(0.0007));
}

TEST_CASE("log ticks: decades, with 2 and 5 where few decades leave room") {
  CHECK(labels(log_ticks(0.01, 10.0, 6)) == std::vector<std::string>{"0.01", "0.1", "1", "10"});
  CHECK(labels(log_ticks(1.0, 10.0, 6)) == std::vector<std::string>{"1", "2", "5", "10"});
  CHECK(labels(log_ticks(1e-6, 100.0, 4)) ==
        std::vector<std::string>{"0.000001", "0.0001", "0.01", "1", "100"});
}

TEST_CASE("ranges are rounded outwards, and a lone value gets room") {
  const AxisRange r = round_linear({-113.0, -16.2}, 6);
  CHECK(r.low == -120.0);
  CHECK(r.high == 0.0);
  const AxisRange kept = round_linear({-60.0, 0.0}, 6);
  CHECK(kept.low == -60.0);
  CHECK(kept.high == 0.0);
  const AxisRange one = round_linear({10.0, 10.0}, 6);
  CHECK(one.low < 10.0);
  CHECK(one.high > 10.0);
  const AxisRange log = round_log({0.0031, 17.0});
  CHECK(log.low == doctest::Approx(0.002));
  CHECK(log.high == doctest::Approx(20.0));
  const AxisRange lone = round_log({1.0, 1.0});
  CHECK(lone.low < 1.0);
  CHECK(lone.high > 1.0);
}

TEST_CASE("labels: true minus, no trailing zeros, no negative zero") {
  CHECK(tick_label(-6.0, 0) == "\u22126");
  CHECK(tick_label(0.25, 3) == "0.25");
  CHECK(tick_label(-1e-12, 2) == "0");
  CHECK(tick_label(100.0, 0) == "100");
}

}  // namespace
}  // namespace kneeprint
