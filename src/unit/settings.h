// SPDX-License-Identifier: GPL-3.0-or-later
// Reads a unit's settings; what is unknown or impossible is refused by name.
#pragma once

#include <initializer_list>
#include <set>
#include <string>
#include <string_view>

#include "unit/unit.h"

namespace kneeprint {

class SettingsReader {
 public:
  /// `unit` stands in the messages. `settings` must outlive the reader.
  SettingsReader(std::string_view unit, const UnitSettings& settings);

  /// Throws UsageError when it is no number or outside [lowest, highest].
  double number(const std::string& key, double otherwise, double lowest, double highest);
  /// The position of the value in `allowed`; throws UsageError when it is none of them.
  std::size_t choice(const std::string& key, std::size_t otherwise,
                     std::initializer_list<std::string_view> allowed);
  /// Throws UsageError when there is a setting that nobody asked for. Call last.
  void finish() const;

 private:
  const std::string* find(const std::string& key);
  std::string unit_;
  const UnitSettings& settings_;
  std::set<std::string> known_;
};

}  // namespace kneeprint
