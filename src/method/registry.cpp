// SPDX-License-Identifier: GPL-3.0-or-later
#include <array>

#include "method/difference.h"
#include "method/method.h"
#include "method/modulation.h"
#include "method/steady.h"

namespace kneeprint {

std::span<const Method> methods() {
  static const std::array table{
      steady_sine(),
      smpte_modulation(),
      ccif_difference(),
  };
  return table;
}

const Method* find_method(std::string_view id) {
  for (const Method& m : methods()) {
    if (m.id == id) return &m;
  }
  return nullptr;
}

std::vector<std::string> method_ids() {
  std::vector<std::string> ids;
  for (const Method& m : methods()) ids.emplace_back(m.id);
  return ids;
}

}  // namespace kneeprint
