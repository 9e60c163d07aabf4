// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/modulation.h"

#include <cmath>

#include "method/two_tone.h"

namespace kneeprint {
namespace {

constexpr double kRatio = 4.0;
constexpr TonePair kSmpte{"smpte", Hertz(60.0), Hertz(7000.0), kRatio, true};
constexpr TonePair kDin{"din", Hertz(250.0), Hertz(8000.0), kRatio, true};
constexpr TonePair kAny{"modulation", Hertz(0.0), Hertz(0.0), kRatio, true};  // tones by the plan

constexpr std::array kSecond{ProductIndex{-1, 1}, ProductIndex{1, 1}};
constexpr std::array kThird{ProductIndex{-2, 1}, ProductIndex{2, 1}};

// Amplitude and phase modulation parts of a sideband pair, as indices of the carrier: with the
// upper and lower sideband referred to carrier and modulating tone, AM is |u + conj(l)|, PM |u -
// conj(l)|.
void split_modulation(const TwoToneReading& reading, std::span<const ProductIndex> pair,
                      const Line& carrier, TwoToneReading::Row& row) {
  if (!row.point.db) return;
  const auto lower = std::conj(reading.product(pair[0]).mean);
  const auto upper = reading.product(pair[1]).mean;
  const double c = std::abs(carrier.mean);
  row.point.am_percent = 100.0 * std::abs(upper + lower) / c;
  row.point.pm_percent = 100.0 * std::abs(upper - lower) / c;
}

TakeVerdict read(const TonePair& pair, const TakeSpec& spec, const TakeData& take,
                 const RigView& rig, Curves& out) {
  const TwoToneReading reading(pair, spec, take, rig);
  if (!reading.has_tones()) return reading.verdict();
  const auto carrier = reading.upper_tone();
  auto m2 = reading.arithmetic_sum("m2", kSecond, carrier);
  auto m3 = reading.arithmetic_sum("m3", kThird, carrier);
  split_modulation(reading, kSecond, carrier.line, m2);
  split_modulation(reading, kThird, carrier.line, m3);
  const auto m2_rss = reading.root_sum("m2-rss", kSecond, carrier);
  const auto m3_rss = reading.root_sum("m3-rss", kThird, carrier);
  for (const IntermodPoint& row : {m2.point, m3.point, reading.total("total", m2, m3), m2_rss.point,
                                   m3_rss.point, reading.total("total-rss", m2_rss, m3_rss)}) {
    out.intermods.push_back(row);
  }
  reading.list_products(carrier, out.products);
  return reading.verdict();
}

std::vector<PredictedProduct> predict(const TonePair& pair, const TwoToneCurve& curve,
                                      double peak) {
  const auto a =
      curve(pair.share1() * peak, pair.share2() * peak, {{0, 1}, {-1, 1}, {1, 1}, {-2, 1}, {2, 1}});
  const double carrier = std::abs(a[0]);
  const double m2 = (std::abs(a[1]) + std::abs(a[2])) / carrier;
  const double m3 = (std::abs(a[3]) + std::abs(a[4])) / carrier;
  return {{"m2", m2}, {"m3", m3}, {"total", std::hypot(m2, m3)}};
}

}  // namespace

Method smpte_modulation() {
  return two_tone_method<kSmpte, read, predict>("modulation distortion, 60 Hz and 7 kHz, 4:1",
                                                "IEC 60268-3; SMPTE RP 120", {.id = "smpte"});
}

Method din_modulation() {
  return two_tone_method<kDin, read, predict>("modulation distortion, 250 Hz and 8 kHz, 4:1",
                                              "IEC 60268-3; DIN 45403", {.id = "din"});
}

Method modulation() {
  return two_tone_method<kAny, read, predict>(
      "modulation distortion, tones and ratio of the plan", "IEC 60268-3",
      {.id = "modulation", .tones = true, .tones_required = true, .ratio = true});
}

}  // namespace kneeprint
