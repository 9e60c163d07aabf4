// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/points.h"

#include <array>
#include <utility>

namespace kneeprint {
namespace {

constexpr std::array<std::pair<Flag, std::string_view>, 6> kFlags{{{Flag::none, ""},
                                                                   {Flag::floor, "floor"},
                                                                   {Flag::noise, "noise"},
                                                                   {Flag::alias, "alias"},
                                                                   {Flag::clipped, "clipped"},
                                                                   {Flag::unsteady, "unsteady"}}};

}  // namespace

std::string_view name(Flag flag) {
  for (const auto& [value, text] : kFlags) {
    if (value == flag) return text;
  }
  return "";
}

std::optional<Flag> flag_named(std::string_view text) {
  for (const auto& [value, known] : kFlags) {
    if (known == text) return value;
  }
  return std::nullopt;
}

}  // namespace kneeprint
