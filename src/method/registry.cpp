// SPDX-License-Identifier: GPL-3.0-or-later
#include <array>

#include "method/difference.h"
#include "method/method.h"
#include "method/modulation.h"
#include "method/multitone.h"
#include "method/reference_tone.h"
#include "method/silence.h"
#include "method/square_sine.h"
#include "method/steady.h"
#include "method/swept.h"

namespace kneeprint {

std::span<const Method> methods() {
  // clang-format off
  static const std::array table{
      steady_sine(),
      swept_sine(),
      smpte_modulation(),
      din_modulation(),
      modulation(),
      ccif_difference(),
      total_difference(),
      square_sine(),
      multitone(),
      silence(),
      reference_tone(),
  };
  // clang-format on
  return table;
}

const Method* find_method(std::string_view id) {
  for (const Method& m : methods()) {
    if (m.id == id) return &m;
  }
  return nullptr;
}

std::vector<MethodNeeds> method_needs() {
  std::vector<MethodNeeds> needs;
  for (const Method& m : methods()) needs.push_back(m.needs);
  return needs;
}

}  // namespace kneeprint
