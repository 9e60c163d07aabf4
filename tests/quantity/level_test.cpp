// SPDX-License-Identifier: GPL-3.0-or-later
#include "quantity/level.h"

#include <doctest/doctest.h>

#include <cmath>
#include <type_traits>

namespace kneeprint {
namespace {

template <class A, class B>
constexpr bool adds = requires(A a, B b) {
  a + b;
};
template <class A, class B>
constexpr bool subtracts = requires(A a, B b) {
  a - b;
};
template <class A, class B>
constexpr bool multiplies = requires(A a, B b) {
  a* b;
};
template <class A, class B>
constexpr bool divides = requires(A a, B b) {
  a / b;
};
template <class A, class B>
constexpr bool compares = requires(A a, B b) {
  a < b;
};
template <class From, class To>
constexpr bool converts = std::is_convertible_v<From, To>;

// What makes sense compiles ...
static_assert(adds<LevelDbu, Decibels> && subtracts<LevelDbu, Decibels>);
static_assert(subtracts<LevelDbu, LevelDbu> && adds<Decibels, Decibels>);
static_assert(std::is_same_v<decltype(LevelDbu() - LevelDbu()), Decibels>);
static_assert(std::is_same_v<decltype(LevelDbu() + Decibels()), LevelDbu>);
static_assert(adds<Hertz, Hertz> && multiplies<double, Hertz> && divides<Hertz, double>);
static_assert(std::is_same_v<decltype(Hertz() / Hertz()), double>);
// ... and what does not, does not.
static_assert(!adds<LevelDbu, LevelDbu> && !adds<LevelDbfs, LevelDbfs>);
static_assert(!adds<Decibels, LevelDbu>);
static_assert(!subtracts<LevelDbu, LevelDbv> && !compares<LevelDbu, LevelDbfs>);
static_assert(!adds<LevelDbu, double> && !adds<Decibels, double> && !multiplies<double, LevelDbu>);
static_assert(!adds<Hertz, Seconds> && !adds<Hertz, double> && !subtracts<double, Seconds>);
static_assert(!multiplies<Hertz, Hertz> && !multiplies<Hertz, Seconds> && !divides<double, Hertz>);
static_assert(!divides<Hertz, Seconds> && !compares<Hertz, Seconds> && !compares<Hertz, double>);
static_assert(!adds<VoltsRms, VoltsPeak> && !compares<VoltsRms, VoltsPeak>);
// No number becomes a quantity by itself, no quantity a number or another quantity.
static_assert(!converts<double, Hertz> && !converts<double, Decibels> &&
              !converts<double, LevelDbu>);
static_assert(!converts<Hertz, double> && !converts<Decibels, double> &&
              !converts<LevelDbu, double>);
static_assert(!converts<VoltsRms, VoltsPeak> && !converts<LevelDbu, LevelDbv>);
static_assert(!std::is_constructible_v<Hertz, Seconds>);
static_assert(!std::is_constructible_v<LevelDbu, LevelDbv>);

}  // namespace

TEST_CASE("dBu, volts rms, volts peak and dBV agree with the table of 1 mW in 600 ohm") {
  // 0 dBu = sqrt(0.6) V; computed from that definition with six decimals.
  const struct {
    double dbu, rms, peak, dbv;
  } rows[] = {{-60, 0.000775, 0.001095, -62.2185}, {-20, 0.077460, 0.109545, -22.2185},
              {-10, 0.244949, 0.346410, -12.2185}, {0, 0.774597, 1.095445, -2.2185},
              {4, 1.227653, 1.736164, 1.7815},     {6, 1.545524, 2.185700, 3.7815},
              {14, 3.882180, 5.490231, 11.7815},   {18, 6.152840, 8.701430, 15.7815},
              {24, 12.276530, 17.361635, 21.7815}, {28, 19.456989, 27.516337, 25.7815}};
  for (const auto& row : rows) {
    CAPTURE(row.dbu);
    const VoltsRms v = to_volts(LevelDbu(row.dbu));
    // Half of the last printed digit.
    CHECK(std::abs(v.value() - row.rms) < 5.1e-7);
    CHECK(std::abs(sine_peak(v).value() - row.peak) < 5.1e-7);
    CHECK(std::abs(to_dbv(v).value() - row.dbv) < 5.1e-5);
    CHECK(to_dbu(v).value() == doctest::Approx(row.dbu).epsilon(1e-13));
    CHECK(sine_rms(sine_peak(v)).value() == doctest::Approx(v.value()).epsilon(1e-15));
  }
}

TEST_CASE("the constants between the references") {
  CHECK(kZeroDbu.value() == doctest::Approx(0.774596669241483).epsilon(1e-15));
  CHECK(to_dbu(kZeroDbv).value() == doctest::Approx(2.218487496164).epsilon(1e-12));
  CHECK(to_dbv(to_volts(LevelDbu(4.0))).value() == doctest::Approx(1.781512503836).epsilon(1e-12));
  CHECK(to_volts(LevelDbv(-10.0)).value() == doctest::Approx(0.316227766016838).epsilon(1e-14));
  // The gap between professional and consumer line level.
  CHECK(to_dbu(to_volts(LevelDbu(4.0))) - to_dbu(to_volts(LevelDbv(-10.0))) >
        Decibels(11.781512503835));
  CHECK(to_dbu(to_volts(LevelDbu(4.0))) - to_dbu(to_volts(LevelDbv(-10.0))) <
        Decibels(11.781512503837));
}

TEST_CASE("decibels are twenty times the logarithm of an amplitude ratio, and back") {
  CHECK(Decibels::of_ratio(10.0).value() == doctest::Approx(20.0));
  CHECK(Decibels::of_ratio(2.0).value() == doctest::Approx(6.020599913280).epsilon(1e-12));
  CHECK(Decibels(-20.0).ratio() == doctest::Approx(0.1).epsilon(1e-15));
  CHECK(Decibels::of_ratio(0.0).value() == -std::numeric_limits<double>::infinity());
  CHECK((LevelDbfs(-18.0) + Decibels(6.0)) == LevelDbfs(-12.0));
  CHECK((LevelDbfs(-18.0) - LevelDbfs(-12.0)) == Decibels(-6.0));
  CHECK(2.0 * Decibels(3.0) == -Decibels(-6.0));
}

TEST_CASE("a full-scale sine is 0 dBFS") {
  CHECK(sine_peak(LevelDbfs(0.0)) == 1.0);
  CHECK(sine_peak(LevelDbfs(-20.0)) == doctest::Approx(0.1).epsilon(1e-15));
}

TEST_CASE("cycles and periods") {
  CHECK(cycles(Hertz(997.0), Seconds(2.0)) == 1994.0);
  CHECK(period(Hertz(50.0)) == Seconds(0.02));
}

}  // namespace kneeprint
