// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/ticks.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace kneeprint {
namespace {

constexpr double kSteps[] = {1.0, 2.0, 5.0, 10.0};
constexpr double kSlack = 1e-9;  ///< of a step: a tick on the edge belongs to the axis

int decimals_for(double step) {
  return std::max(0, static_cast<int>(-std::floor(std::log10(step) + kSlack)));
}

}  // namespace

double tick_step(double span, int most) {
  const double wanted = span / most;
  const double power = std::pow(10.0, std::floor(std::log10(wanted)));
  for (double s : kSteps)
    if (s * power >= wanted * (1.0 - kSlack)) return s * power;
  return 10.0 * power;
}

std::string tick_label(double value, int decimals) {
  std::string text = fmt::format("{:.{}f}", std::abs(value), decimals);
  if (text.find('.') != std::string::npos) {
    text.erase(text.find_last_not_of('0') + 1);
    if (text.back() == '.') text.pop_back();
  }
  return value < 0.0 && text != "0" ? "\u2212" + text : text;
}

std::vector<Tick> linear_ticks(double low, double high, int most) {
  const double step = tick_step(high - low, most);
  const int decimals = decimals_for(step);
  // Minor ticks halve a step of 2, and divide the others by five.
  const double power = std::pow(10.0, std::floor(std::log10(step) + kSlack));
  const int parts = std::lround(step / power) == 2 ? 2 : 5;
  std::vector<Tick> ticks;
  const auto first = std::llround(std::ceil(low / step * parts - kSlack));
  const auto last = std::llround(std::floor(high / step * parts + kSlack));
  for (auto k = first; k <= last; ++k) {
    const double at = static_cast<double>(k) / parts * step;
    ticks.push_back({at, k % parts == 0 ? tick_label(at, decimals) : ""});
  }
  return ticks;
}

std::vector<Tick> log_ticks(double low, double high, int most) {
  const double decades = std::log10(high / low);
  const bool all_labelled = decades * 3.0 <= most;  // 1, 2, 5 of every decade
  const int skip = std::max(1, static_cast<int>(std::ceil(decades / most)));
  std::vector<Tick> ticks;
  const int first = static_cast<int>(std::floor(std::log10(low)));
  const int last = static_cast<int>(std::ceil(std::log10(high)));
  for (int e = first; e <= last; ++e)
    for (int m = 1; m <= 9; ++m) {
      const double at = m * std::pow(10.0, e);
      if (at < low * (1.0 - kSlack) || at > high * (1.0 + kSlack)) continue;
      const bool labelled = (m == 1 && e % skip == 0) || (all_labelled && (m == 2 || m == 5));
      ticks.push_back({at, labelled ? tick_label(at, std::max(0, -e)) : ""});
    }
  return ticks;
}

AxisRange round_linear(AxisRange data, int most) {
  if (!(data.high > data.low)) {
    const double half = data.low == 0.0 ? 1.0 : std::max(1.0, 0.05 * std::abs(data.low));
    return {data.low - half, data.high + half};
  }
  const double step = tick_step(data.high - data.low, most);
  return {step * std::floor(data.low / step + kSlack), step * std::ceil(data.high / step - kSlack)};
}

AxisRange round_log(AxisRange data) {
  const auto grid = [](double v, bool up) {
    const double power = std::pow(10.0, std::floor(std::log10(v)));
    double below = power;
    for (double s : kSteps) {
      if (up && s * power >= v * (1.0 - kSlack)) return s * power;
      if (s * power <= v * (1.0 + kSlack)) below = s * power;
    }
    return below;
  };
  AxisRange r{grid(data.low, false), grid(data.high, true)};
  if (!(r.high > r.low)) r = {r.low / 2.0, r.high * 2.0};
  return r;
}

}  // namespace kneeprint
