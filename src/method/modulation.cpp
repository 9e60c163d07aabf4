// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/modulation.h"

#include <cmath>

#include "method/two_tone.h"

namespace kneeprint {
namespace {

constexpr TonePair kSmpte{"smpte", Hertz(60.0), Hertz(7000.0), 0.8, 0.2, true};

// What the rig's own second and third harmonic amount to here, for a weakly curved rig at the same
// peak: m2 / HD2 = 3.2 and m3 / HD3 = 3.84 (expansion of a cubic; U1 = 0.8 P, U2 = 0.2 P:
// 2 a2 U1 / a1 over a2 P / 2 a1, and 3/2 a3 U1^2 / a1 over a3 P^2 / 4 a1).
constexpr double kSecondOverHarmonic = 3.2;
constexpr double kThirdOverHarmonic = 3.84;

// Amplitude and phase modulation parts of a sideband pair, as indices of the carrier: with the
// upper and lower sideband referred to carrier and modulating tone, AM is |u + conj(l)|, PM |u -
// conj(l)|.
void split_modulation(IntermodPoint& point, const Line& upper, const Line& lower,
                      const Line& carrier) {
  const double c = std::abs(carrier.mean);
  point.am_percent = 100.0 * std::abs(upper.mean + std::conj(lower.mean)) / c;
  point.pm_percent = 100.0 * std::abs(upper.mean - std::conj(lower.mean)) / c;
}

TakeVerdict read(const TakeSpec& spec, const TakeData& take, const RigView& rig, Curves& out) {
  const TwoToneReading reading(kSmpte, spec, take, rig);
  if (!reading.has_tones()) return reading.verdict();
  const auto floor = [&](int order, double factor) {
    return factor * rig.floor.at(spec.send, reading.return_level(), order).value_or(0.0);
  };
  const Line& carrier = reading.tone2();
  auto m2 = reading.sum("m2", {ProductIndex{-1, 1}, ProductIndex{1, 1}}, carrier,
                        floor(2, kSecondOverHarmonic));
  auto m3 = reading.sum("m3", {ProductIndex{-2, 1}, ProductIndex{2, 1}}, carrier,
                        floor(3, kThirdOverHarmonic));
  split_modulation(m2.point, reading.product({1, 1}), reading.product({-1, 1}), carrier);
  split_modulation(m3.point, reading.product({2, 1}), reading.product({-2, 1}), carrier);
  out.intermods.push_back(m2.point);
  out.intermods.push_back(m3.point);
  out.intermods.push_back(reading.total(m2, m3));
  return reading.verdict();
}

std::vector<PredictedProduct> predict(const TwoToneCurve& curve, const StepOptions&, double peak) {
  const auto a =
      curve(kSmpte.share1 * peak, kSmpte.share2 * peak, {{0, 1}, {-1, 1}, {1, 1}, {-2, 1}, {2, 1}});
  const double carrier = std::abs(a[0]);
  const double m2 = (std::abs(a[1]) + std::abs(a[2])) / carrier;
  const double m3 = (std::abs(a[3]) + std::abs(a[4])) / carrier;
  return {{"m2", m2}, {"m3", m3}, {"total", std::hypot(m2, m3)}};
}

}  // namespace

Method smpte_modulation() {
  return {"smpte",
          "modulation distortion, 60 Hz and 7 kHz, 4:1",
          "IEC 60268-3; SMPTE RP 120",
          Placement::every_rung,
          {.id = "smpte"},
          [](const TakeSpec& s, Hertz r) { return two_tone_first_hold_blocks(kSmpte, s, r); },
          [](const TakeSpec& s, Hertz r) { return two_tone_block_length(kSmpte, s, r); },
          [](const TakeSpec& s, Hertz r) { return two_tone_stimulus(kSmpte, s, r); },
          read,
          predict,
          [](const TakeSpec& s, Hertz r) { return two_tone_length(kSmpte, s, r); }};
}

}  // namespace kneeprint
