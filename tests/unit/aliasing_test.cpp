// SPDX-License-Identifier: GPL-3.0-or-later
// Each unit's own aliasing at its oversampling, at the hottest drive that the virtual converters
// reach.
//
// The stimulus repeats after N samples of the higher rate, N odd and without common divisor with
// the number of cycles: harmonics and products stand on multiples of that number, and what folds
// back from above half the rate stands on other lines.
#include <doctest/doctest.h>

#include <cmath>
#include <initializer_list>
#include <numbers>
#include <numeric>
#include <string>
#include <vector>

#include "unit/harmonics.h"
#include "unit/unit.h"

namespace {

constexpr double kHottest = 17.36;  // V peak: +24 dBu
constexpr double kBand = 20000.0;   // Hz
constexpr double kAllowedDb = -120.0;

struct Tones {
  double base;                     // Hz; lines at multiples of it are legitimate
  std::size_t cycles;              // of the base in the span
  std::vector<std::size_t> parts;  // tones as multiples of the base, equal amplitudes
};

double worst_alias_db(const kneeprint::UnitRecord& record, const kneeprint::UnitSettings& settings,
                      const Tones& tones) {
  const double rate = 48000.0 * record.oversampling;
  auto size = static_cast<std::size_t>(rate * static_cast<double>(tones.cycles) / tones.base);
  while (size % 2 == 0 || std::gcd(size, tones.cycles) != 1) ++size;
  std::vector<double> stimulus(size);
  for (std::size_t n = 0; n < size; ++n) {
    for (const std::size_t part : tones.parts) {
      const double angle = 2.0 * std::numbers::pi *
                           static_cast<double>(tones.cycles * part * n % size) /
                           static_cast<double>(size);
      stimulus[n] += kHottest / static_cast<double>(tones.parts.size()) * std::sin(angle);
    }
  }
  const auto unit = record.make(settings, kneeprint::Hertz(rate));
  std::vector<double> x;
  // 1.5 s: more than twenty of the triode's longest time constant.
  const double periods = record.id == "triode" ? 1.5 * rate / static_cast<double>(size) : 3.0;
  for (double p = 0.0; p < periods; p += 1.0) {
    x = stimulus;
    unit->process(x);
  }
  const double fundamental = std::abs(line(x, tones.cycles * tones.parts[0]));
  double worst = 0.0;
  const auto last = static_cast<std::size_t>(kBand * static_cast<double>(size) / rate);
  for (std::size_t k = 1; k <= last; ++k) {
    if (k % tones.cycles) worst = std::fmax(worst, std::abs(line(x, k)));
  }
  return 20.0 * std::log10(worst / fundamental);
}

void check_unit(const kneeprint::UnitRecord& record, const kneeprint::UnitSettings& settings) {
  CAPTURE(record.id);
  CHECK(worst_alias_db(record, settings, {997.0, 3, {1}}) < kAllowedDb);
  CHECK(worst_alias_db(record, settings, {4987.0, 13, {1}}) < kAllowedDb);
  CHECK(worst_alias_db(record, settings, {1000.0, 3, {19, 20}}) < kAllowedDb);
}

}  // namespace

TEST_CASE("no unit aliases above -120 dB at +24 dBu") {
  for (const auto& record : kneeprint::virtual_units()) check_unit(record, {});
}

TEST_CASE("no sigmoid family aliases above -120 dB at +24 dBu") {
  for (const char* family : {"atan", "algebraic", "erf"}) {
    check_unit(kneeprint::virtual_unit("sigmoid"), {{"family", family}});
  }
}

TEST_CASE("too little oversampling would show") {
  kneeprint::UnitRecord starved = kneeprint::virtual_unit("sigmoid");
  starved.oversampling = 4;
  CHECK(worst_alias_db(starved, {}, {1000.0, 3, {19, 20}}) > kAllowedDb);
}
