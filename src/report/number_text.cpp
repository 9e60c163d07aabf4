// SPDX-License-Identifier: GPL-3.0-or-later
#include "report/number_text.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace kneeprint {
namespace {

std::string true_minus(std::string text) {
  if (text.find_first_of("123456789") == std::string::npos) {
    if (text[0] == '-') text.erase(0, 1);
    return text;
  }
  if (text[0] == '-') text.replace(0, 1, kMinus);
  if (const auto e = text.find("e-"); e != std::string::npos) text.replace(e + 1, 1, kMinus);
  return text;
}

}  // namespace

int decimals_for(double expanded_u) {
  if (!(expanded_u > 0.0) || !std::isfinite(expanded_u)) return 2;
  const int leading = static_cast<int>(std::floor(std::log10(expanded_u)));
  return std::clamp(1 - leading, 0, 9);
}

std::string fixed_text(double value, int decimals) {
  if (!std::isfinite(value)) return kDash;
  return true_minus(fmt::format("{:.{}f}", value, decimals));
}

std::string short_text(double value, int digits) {
  if (!std::isfinite(value)) return kDash;
  const double size = std::abs(value);
  if (size >= 1e6 || (size > 0.0 && size < 1e-6))
    return true_minus(fmt::format("{:.{}e}", value, digits - 1));
  const int leading = size > 0.0 ? static_cast<int>(std::floor(std::log10(size))) : 0;
  std::string text = fmt::format("{:.{}f}", value, std::max(0, digits - 1 - leading));
  if (text.find('.') != std::string::npos) {
    text.erase(text.find_last_not_of('0') + 1);
    if (text.back() == '.') text.pop_back();
  }
  return true_minus(text);
}

std::string with_u(const Cell& value, const Cell& expanded_u, int decimals) {
  if (!value || !std::isfinite(*value)) return kDash;
  if (!expanded_u || !(*expanded_u > 0.0) || !std::isfinite(*expanded_u))
    return fixed_text(*value, decimals);
  const int d = decimals_for(*expanded_u);
  return fixed_text(*value, d) + " ± " + fixed_text(*expanded_u, d);
}

std::string with_interval(const FittedParameter& p) {
  const int d = decimals_for(0.5 * (p.high95 - p.low95));
  return fmt::format("{} ({} to {})", fixed_text(p.value, d), fixed_text(p.low95, d),
                     fixed_text(p.high95, d));
}

std::string frequency_text(double hz) {
  return hz >= 1000.0 ? short_text(hz / 1000.0, 3) + " kHz" : short_text(hz, 3) + " Hz";
}

}  // namespace kneeprint
