// SPDX-License-Identifier: GPL-3.0-or-later
#include <array>

#include "sigmoid/algebraic_family.h"
#include "sigmoid/atan_family.h"
#include "sigmoid/erf_family.h"
#include "sigmoid/family.h"
#include "sigmoid/tanh_family.h"

namespace kneeprint {

std::span<const SigmoidFamily> sigmoid_families() {
  static const std::array table{
      tanh_family(),
      atan_family(),
      algebraic_family(),
      erf_family(),
  };
  return table;
}

const SigmoidFamily* find_family(std::string_view id) {
  for (const SigmoidFamily& f : sigmoid_families()) {
    if (f.id == id) return &f;
  }
  return nullptr;
}

double evaluate(const SigmoidFamily& family, const SigmoidParameters& p, double x) {
  return p.limit *
         (family.value(p.drive * x + p.bias, p.sharpness) - family.value(p.bias, p.sharpness));
}

}  // namespace kneeprint
