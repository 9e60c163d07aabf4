// SPDX-License-Identifier: GPL-3.0-or-later
// What holds for every virtual unit.
#include <doctest/doctest.h>

#include <bit>
#include <boost/random/mersenne_twister.hpp>
#include <cmath>
#include <initializer_list>
#include <set>
#include <string>
#include <vector>

#include "quantity/failure.h"
#include "unit/unit.h"

using kneeprint::Hertz;
using kneeprint::virtual_unit;
using kneeprint::virtual_units;

TEST_CASE("the registry holds the promised units, each once") {
  std::set<std::string> ids;
  for (const auto& unit : virtual_units()) {
    CHECK(ids.insert(std::string(unit.id)).second);
    CHECK(std::has_single_bit(static_cast<unsigned>(unit.oversampling)));
    CHECK_FALSE(unit.title.empty());
    CHECK_FALSE(unit.description.empty());
  }
  CHECK(ids == std::set<std::string>{"wire", "sigmoid", "triode", "diode", "push-pull"});
  CHECK(virtual_unit("diode").id == "diode");
  CHECK_THROWS_AS(virtual_unit("pentode"), kneeprint::UsageError);
}

TEST_CASE("every unit rests at zero, repeats itself, and refuses an unknown setting") {
  for (const auto& record : virtual_units()) {
    CAPTURE(record.id);
    const Hertz rate(48000.0 * record.oversampling);
    std::vector<double> silence(1000, 0.0);
    record.make({}, rate)->process(silence);
    for (const double v : silence) CHECK(std::fabs(v) < 1e-12);

    std::vector<double> one(2000), two(2000);
    for (std::size_t n = 0; n < one.size(); ++n)
      one[n] = two[n] = 3.0 * std::sin(0.01 * static_cast<double>(n));
    record.make({}, rate)->process(one);
    const auto unit = record.make({}, rate);
    unit->process(std::span(two).first(777));
    unit->process(std::span(two).subspan(777));
    CHECK(one == two);
    CHECK_THROWS_AS(record.make({{"colour", "red"}}, rate), kneeprint::UsageError);
  }
}

TEST_CASE("no input within 20 V makes a unit leave its bounds") {
  boost::random::mt19937_64 random(20240611);
  for (const auto& record : virtual_units()) {
    for (const int oversampling : {16, 64}) {
      CAPTURE(record.id);
      const auto unit = record.make({}, Hertz(48000.0 * oversampling));
      std::vector<double> x(200000);
      const auto run = [&] {
        unit->process(x);
        double worst = 0.0;
        for (const double v : x) worst = std::fmax(worst, std::isfinite(v) ? std::fabs(v) : 1e9);
        CHECK(worst <= 40.0);
      };
      for (auto& v : x) v = (random() & 1) ? 20.0 : -20.0;  // white square noise
      run();
      for (std::size_t n = 0; n < x.size(); ++n) x[n] = n / 40000 % 2 ? 20.0 : -20.0;
      run();
      for (auto& v : x) v = 20.0;
      run();
      for (std::size_t n = 0; n < x.size(); ++n) x[n] = n % 2 ? 20.0 : -20.0;
      run();
    }
  }
}
