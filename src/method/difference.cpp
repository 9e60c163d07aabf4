// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/difference.h"

#include <cmath>

#include "method/two_tone.h"

namespace kneeprint {
namespace {

constexpr TonePair kCcif{"ccif", Hertz(19000.0), Hertz(20000.0), 0.5, 0.5, false};

// For a weakly curved rig at the same peak: d2 = HD2 / 2 and d3 = 3/4 HD3 (expansion of a cubic
// with U = P / 2: a2 U / 2 a1 over a2 P / 2 a1, and 3/4 a3 U^2 / a1 over a3 P^2 / 4 a1).
constexpr double kSecondOverHarmonic = 0.5;
constexpr double kThirdOverHarmonic = 0.75;

TakeVerdict read(const TakeSpec& spec, const TakeData& take, const RigView& rig, Curves& out) {
  const TwoToneReading reading(kCcif, spec, take, rig);
  if (!reading.has_tones()) return reading.verdict();
  const auto floor = [&](int order, double factor) {
    return factor * rig.floor.at(spec.send, reading.return_level(), order).value_or(0.0);
  };
  const Line low = reading.product({1, 0}), high = reading.product({0, 1});
  const std::array parts{Contribution{low.u, low.dof}, Contribution{high.u, high.dof}};
  const Contribution c = combine(parts);
  const Line both{std::abs(low.mean) + std::abs(high.mean), c.u, c.dof};
  const auto d2 = reading.single("d2", {-1, 1}, both, floor(2, kSecondOverHarmonic));
  const auto d3 = reading.sum("d3", {ProductIndex{2, -1}, ProductIndex{-1, 2}}, both,
                              floor(3, kThirdOverHarmonic));
  out.intermods.push_back(d2.point);
  out.intermods.push_back(d3.point);
  out.intermods.push_back(reading.total(d2, d3));
  return reading.verdict();
}

std::vector<PredictedProduct> predict(const TwoToneCurve& curve, const StepOptions&, double peak) {
  const auto a =
      curve(kCcif.share1 * peak, kCcif.share2 * peak, {{1, 0}, {0, 1}, {-1, 1}, {2, -1}, {-1, 2}});
  const double both = std::abs(a[0]) + std::abs(a[1]);
  const double d2 = std::abs(a[2]) / both;
  const double d3 = (std::abs(a[3]) + std::abs(a[4])) / both;
  return {{"d2", d2}, {"d3", d3}, {"total", std::hypot(d2, d3)}};
}

}  // namespace

Method ccif_difference() {
  return {"ccif",
          "difference-frequency distortion, 19 and 20 kHz, 1:1",
          "IEC 60268-3; ITU-R twin tone",
          Placement::every_rung,
          {.id = "ccif"},
          [](const TakeSpec& s, Hertz r) { return two_tone_first_hold_blocks(kCcif, s, r); },
          [](const TakeSpec& s, Hertz r) { return two_tone_block_length(kCcif, s, r); },
          [](const TakeSpec& s, Hertz r) { return two_tone_stimulus(kCcif, s, r); },
          read,
          predict,
          [](const TakeSpec& s, Hertz r) { return two_tone_length(kCcif, s, r); }};
}

}  // namespace kneeprint
