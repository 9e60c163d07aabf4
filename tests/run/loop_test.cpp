// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/loop.h"

#include <doctest/doctest.h>

#include <cmath>
#include <numbers>

#include "quantity/failure.h"
#include "rig/virtual_port.h"

using namespace kneeprint;

namespace {

LoopResult loop_of(const std::string& unit, const ConverterModel& model, LoopRequest request) {
  const auto port = make_virtual_port(parse_virtual_rig(unit), Hertz(48000.0), 3, model);
  SilentProgress unheard;
  return measure_loop(*port, request, unheard);
}

LoopRequest quick() {
  LoopRequest r;
  r.orders = 3;
  r.integration = Seconds(4.0);
  r.ceiling = LevelDbfs(-10.0);
  return r;
}

// Residual of both converters at -10 dBFS: H2 falls with the level, H3 with its square, and send
// and return add.
constexpr double kSecond = -128.0 - 10.0, kThird = -132.0 - 20.0;

}  // namespace

TEST_CASE("a cable shows the converters' residuals, complex, and its gain") {
  ConverterModel model;
  model.noise = LevelDbfs(-220.0);
  model.dither_and_quantise = false;
  model.full_scale_u = Decibels(0.0);
  const LoopResult loop = loop_of("wire", model, quick());
  CHECK(std::abs(loop.gain.value()) < 1e-6);
  int seen = 0;
  for (const FloorPoint& p : loop.floor) {
    if (p.level != LevelDbfs(-10.0)) continue;
    ++seen;
    // Both in phase: twice the one; a memoryless curve gives 0 or 180 degrees. Stored samples are
    // float32: their rounding leaves about -185 dB in a line of 4 s.
    CHECK(
        p.relative.value() ==
        doctest::Approx((p.order == 2 ? kSecond : kThird) + 20.0 * std::log10(2.0)).epsilon(0.002));
    REQUIRE(p.phase_deg.has_value());
    CHECK(std::abs(*p.phase_deg) < 5.0);
    // The cubes raise the fundamental by three times their third harmonic: 1e-6 dB.
    CHECK(std::abs((p.return_level() - p.level).value()) < 2e-6);
  }
  CHECK(seen == 2);
}

TEST_CASE("a pad tells the send's residual alone, and both paths stay in the rig") {
  ConverterModel model;
  model.noise = LevelDbfs(-220.0);
  model.dither_and_quantise = false;
  Rig rig = virtual_rig(parse_virtual_rig("wire"), Hertz(48000.0), model);
  add_loop(rig, loop_of("wire", model, quick()));
  const auto points = rig.floor.points().size();
  add_loop(rig, loop_of("wire:pad_db=40", model, quick()));
  CHECK(rig.floor.points().size() == 2 * points);
  const auto db = [](std::optional<double> x) { return 20.0 * std::log10(x.value()); };
  // Return 40 dB down: the send's own and, from the cable at the low level, next to nothing.
  CHECK(db(rig.floor.at(LevelDbfs(-10.0), LevelDbfs(-50.0), 2)) ==
        doctest::Approx(kSecond + 20.0 * std::log10(1.02)).epsilon(0.002));
  // The same path again replaces itself.
  add_loop(rig, loop_of("wire:pad_db=40", model, quick()));
  CHECK(rig.floor.points().size() == 2 * points);
}

TEST_CASE("products of the loop are kept, under their method's name") {
  ConverterModel model;
  model.noise = LevelDbfs(-220.0);
  model.dither_and_quantise = false;
  LoopRequest request = quick();
  request.products = true;
  request.ceiling = LevelDbfs(-10.0);
  const RigFloor floor(loop_of("wire", model, request).floor);
  // m2 of a weakly curved rig is 3.2 times its second harmonic at the same peak (expansion of a
  // cubic), m3 3.84 times its third; twice for send and return, twice for the bound.
  const auto m2 = floor.at_product(LevelDbfs(-10.0), LevelDbfs(-10.0), "smpte", "m2");
  REQUIRE(m2.has_value());
  CHECK(20.0 * std::log10(*m2 / 4.0 / 3.2) == doctest::Approx(kSecond).epsilon(0.003));
  CHECK(floor.at_product(LevelDbfs(-10.0), LevelDbfs(-10.0), "ccif", "d3").has_value());
}

TEST_CASE("no return is told before anything is measured") {
  ConverterModel model;
  CHECK_THROWS_AS(loop_of("wire:pad_db=120", model, quick()), NothingUsable);
}
