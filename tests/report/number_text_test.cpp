// SPDX-License-Identifier: GPL-3.0-or-later
#include "report/number_text.h"

#include "doctest/doctest.h"

namespace kneeprint {
namespace {

TEST_CASE("digits follow the uncertainty") {
  CHECK(with_u(-3.21456, 0.0512) == "\u22123.215 ± 0.051");
  CHECK(with_u(12.3456, 1.72) == "12.3 ± 1.7");
  CHECK(with_u(1234.5, 34.0) == "1234 ± 34");
  CHECK(with_u(0.000123456, 0.0000021) == "0.0001235 ± 0.0000021");
  CHECK(with_u(-0.001, 0.5) == "0.00 ± 0.50");  // no negative zero
}

TEST_CASE("nothing is made up") {
  CHECK(with_u({}, 0.1) == kDash);
  CHECK(with_u(1.23456, {}) == "1.23");
  CHECK(with_u(1.23456, 0.0, 3) == "1.235");
  CHECK(fixed_text(std::numeric_limits<double>::quiet_NaN(), 2) == kDash);
}

TEST_CASE("short numbers") {
  CHECK(short_text(0.1) == "0.1");
  CHECK(short_text(-12.345678) == "\u221212.35");
  CHECK(short_text(48000.0) == "48000");
  CHECK(short_text(0.0) == "0");
  CHECK(short_text(2.5e-9, 2) == "2.5e\u221209");
}

TEST_CASE("intervals and frequencies") {
  CHECK(with_interval({0.51234, 0.005, 0.5025, 0.5221}) == "0.5123 (0.5025 to 0.5221)");
  CHECK(frequency_text(41.015625) == "41 Hz");
  CHECK(frequency_text(997.0) == "997 Hz");
  CHECK(frequency_text(4987.0) == "4.99 kHz");
}

}  // namespace
}  // namespace kneeprint
