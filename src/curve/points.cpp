// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/points.h"

#include <array>
#include <iterator>
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

bool Curves::empty() const {
  return levels.empty() && harmonics.empty() && intermods.empty() && responses.empty() &&
         products.empty() && glides.empty() && scalars.empty() && traces.empty();
}

void Curves::append(Curves&& more) {
  const auto take = [](auto& rows, auto& from) {
    rows.insert(rows.end(), std::make_move_iterator(from.begin()),
                std::make_move_iterator(from.end()));
  };
  take(levels, more.levels);
  take(harmonics, more.harmonics);
  take(intermods, more.intermods);
  take(responses, more.responses);
  take(products, more.products);
  take(glides, more.glides);
  take(scalars, more.scalars);
  take(traces, more.traces);
}

}  // namespace kneeprint
