// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/loop_response.h"

#include <doctest/doctest.h>

#include <cmath>
#include <numbers>

using namespace kneeprint;

namespace {

constexpr double kRounding = 1e-12;

double db(std::complex<double> z) { return 20.0 * std::log10(std::abs(z)); }
double degrees(std::complex<double> z) { return std::arg(z) * 180.0 / std::numbers::pi; }

// Out of order on purpose.
const std::vector<LoopPoint> kPoints{{Hertz(1000.0), Decibels(0.0), 0.0},
                                     {Hertz(10000.0), Decibels(-0.6), -40.0},
                                     {Hertz(20.0), Decibels(-0.4), 10.0}};

}  // namespace

TEST_CASE("an unknown response is 1 without doubt") {
  const LoopResponse none;
  CHECK_FALSE(none.known());
  CHECK(none.loop(Hertz(997.0)) == 1.0);
  CHECK(none.ret(Hertz(20.0)).response == 1.0);
  CHECK(none.send(Hertz(20.0)).u == Decibels(0.0));
}

TEST_CASE("decibels and degrees are straight lines over log frequency, and end with the points") {
  const LoopResponse r(kPoints);
  const Hertz middle(std::sqrt(1000.0 * 10000.0));
  CHECK(db(r.loop(middle)) == doctest::Approx(-0.3).epsilon(kRounding));
  CHECK(degrees(r.loop(middle)) == doctest::Approx(-20.0).epsilon(kRounding));
  CHECK(db(r.loop(Hertz(5.0))) == doctest::Approx(-0.4).epsilon(kRounding));
  CHECK(db(r.loop(Hertz(30000.0))) == doctest::Approx(-0.6).epsilon(kRounding));
}

TEST_CASE("send and return make the loop; an unknown split is a rectangular term") {
  for (const std::optional<double> share : {std::optional<double>(), {0.2}, {1.0}}) {
    const LoopResponse r(kPoints, share);
    for (const double hz : {20.0, 300.0, 997.0, 7000.0}) {
      const auto s = r.send(Hertz(hz)), q = r.ret(Hertz(hz));
      CHECK(std::abs(s.response * q.response - r.loop(Hertz(hz))) < kRounding);
      const double most =
          std::abs(db(r.loop(Hertz(hz)))) / 2.0;  // from the even split to either end
      CHECK(q.u.value() == doctest::Approx(share ? 0.0 : most / std::sqrt(3.0)).epsilon(1e-9));
    }
    if (share) CHECK(db(r.ret(Hertz(10000.0)).response) == doctest::Approx(*share * -0.6));
  }
}

TEST_CASE("of a ratio within the return only the difference is in doubt") {
  const LoopResponse r(kPoints);
  const auto same = r.ret_ratio(Hertz(20.0), Hertz(20.0));
  CHECK(same.response == 1.0);
  CHECK(same.u == Decibels(0.0));
  const auto ratio = r.ret_ratio(Hertz(10000.0), Hertz(20.0));
  CHECK(db(ratio.response) == doctest::Approx(-0.1).epsilon(kRounding));
  CHECK(degrees(ratio.response) == doctest::Approx(-25.0).epsilon(kRounding));
  CHECK(ratio.u.value() == doctest::Approx(0.1 / std::sqrt(3.0)).epsilon(1e-9));
}
