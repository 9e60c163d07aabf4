// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/settings.h"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>

#include "quantity/failure.h"

namespace kneeprint {

SettingsReader::SettingsReader(std::string_view unit, const UnitSettings& settings)
    : unit_(unit), settings_(settings) {}

const std::string* SettingsReader::find(const std::string& key) {
  known_.insert(key);
  const auto found = settings_.find(key);
  return found == settings_.end() ? nullptr : &found->second;
}

double SettingsReader::number(const std::string& key, double otherwise, double lowest,
                              double highest) {
  const std::string* text = find(key);
  if (!text) return otherwise;
  double value = std::nan("");
  std::size_t used = 0;
  try {
    value = std::stod(*text, &used);
  } catch (const std::exception&) {
    used = 0;
  }
  if (used == 0 || used != text->size() || !(value >= lowest && value <= highest)) {
    throw UsageError(fmt::format("virtual unit {}: setting {}={} must be a number from {} to {}",
                                 unit_, key, *text, lowest, highest));
  }
  return value;
}

std::size_t SettingsReader::choice(const std::string& key, std::size_t otherwise,
                                   std::initializer_list<std::string_view> allowed) {
  const std::string* text = find(key);
  if (!text) return otherwise;
  const auto* found = std::find(allowed.begin(), allowed.end(), *text);
  if (found == allowed.end()) {
    throw UsageError(fmt::format("virtual unit {}: setting {}={} must be one of {}", unit_, key,
                                 *text, fmt::join(allowed, ", ")));
  }
  return static_cast<std::size_t>(found - allowed.begin());
}

void SettingsReader::finish() const {
  for (const auto& [key, value] : settings_) {
    if (known_.count(key)) continue;
    throw UsageError(known_.empty() ? fmt::format("virtual unit {} takes no settings, found {}={}",
                                                  unit_, key, value)
                                    : fmt::format("virtual unit {} has no setting {}; it has {}",
                                                  unit_, key, fmt::join(known_, ", ")));
  }
}

}  // namespace kneeprint
