// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/tanh_family.h"

#include <cmath>

namespace kneeprint {
namespace {

double value(double z, double) { return std::tanh(z); }

// 1 / cosh^2 keeps its digits far out, where 1 - tanh^2 has none left.
double slope(double z, double) {
  const double c = std::cosh(z);
  return 1.0 / (c * c);
}

double by_sharpness(double, double) { return 0.0; }

}  // namespace

SigmoidFamily tanh_family() {
  return {"tanh",       "hyperbolic tangent",
          "tanh(z)",    false,
          1.0,          1.0,
          value,        slope,
          by_sharpness, "NIST DLMF 4.28.4; slope DLMF 4.34.8 (numbers from memory)"};
}

}  // namespace kneeprint
