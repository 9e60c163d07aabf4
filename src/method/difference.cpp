// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/difference.h"

#include <cmath>

#include "method/two_tone.h"

namespace kneeprint {
namespace {

constexpr TonePair kCcif{"ccif", Hertz(19000.0), Hertz(20000.0)};
constexpr TonePair kTotal{"tdfd", Hertz(8000.0), Hertz(11950.0)};

constexpr std::array kSecond{ProductIndex{-1, 1}};
constexpr std::array kThird{ProductIndex{2, -1}, ProductIndex{-1, 2}};
constexpr std::array kThirdLower{ProductIndex{2, -1}};

TakeVerdict read(const TonePair& pair, const TakeSpec& spec, const TakeData& take,
                 const RigView& rig, Curves& out) {
  const TwoToneReading reading(pair, spec, take, rig);
  if (!reading.has_tones()) return reading.verdict();
  const auto both = reading.both_tones();
  const auto d2 = reading.arithmetic_sum("d2", kSecond, both);
  const auto d3 = reading.arithmetic_sum("d3", kThird, both);
  const auto d3_rss = reading.root_sum("d3-rss", kThird, both);
  for (const IntermodPoint& row : {d2.point, d3.point, reading.total("total", d2, d3), d3_rss.point,
                                   reading.total("total-rss", d2, d3_rss)}) {
    out.intermods.push_back(row);
  }
  reading.list_products(both, out.products);
  return reading.verdict();
}

std::vector<PredictedProduct> predict(const TonePair& pair, const TwoToneCurve& curve,
                                      double peak) {
  const auto a = curve(pair.share1() * peak, pair.share2() * peak,
                       {{1, 0}, {0, 1}, {-1, 1}, {2, -1}, {-1, 2}});
  const double both = std::abs(a[0]) + std::abs(a[1]);
  const double d2 = std::abs(a[2]) / both;
  const double d3 = (std::abs(a[3]) + std::abs(a[4])) / both;
  return {{"d2", d2}, {"d3", d3}, {"total", std::hypot(d2, d3)}};
}

TakeVerdict read_total(const TonePair& pair, const TakeSpec& spec, const TakeData& take,
                       const RigView& rig, Curves& out) {
  const TwoToneReading reading(pair, spec, take, rig);
  if (!reading.has_tones()) return reading.verdict();
  const auto both = reading.both_tones();
  out.intermods.push_back(reading.total("total", reading.arithmetic_sum("d2", kSecond, both),
                                        reading.arithmetic_sum("d3-lower", kThirdLower, both)));
  reading.list_products(both, out.products);
  return reading.verdict();
}

std::vector<PredictedProduct> predict_total(const TonePair& pair, const TwoToneCurve& curve,
                                            double peak) {
  const auto a =
      curve(pair.share1() * peak, pair.share2() * peak, {{1, 0}, {0, 1}, {-1, 1}, {2, -1}});
  return {{"total", std::hypot(a[2], a[3]) / (std::abs(a[0]) + std::abs(a[1]))}};
}

}  // namespace

Method ccif_difference() {
  return two_tone_method<kCcif, read, predict>(
      "difference-frequency distortion, 19 and 20 kHz or the plan's pair, 1:1",
      "IEC 60268-3; ITU-R twin tone", {.id = "ccif", .tones = true});
}

Method total_difference() {
  return two_tone_method<kTotal, read_total, predict_total>(
      "total difference-frequency distortion, 8 and 11.95 kHz, 1:1", "IEC 60268-3", {.id = "tdfd"});
}

}  // namespace kneeprint
