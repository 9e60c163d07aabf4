// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/atan_family.h"

#include <cmath>
#include <numbers>

namespace kneeprint {
namespace {

constexpr double kHalfPi = 0.5 * std::numbers::pi;

double value(double z, double) { return std::atan(kHalfPi * z) / kHalfPi; }

double slope(double z, double) {
  const double w = kHalfPi * z;
  return 1.0 / (1.0 + w * w);
}

double by_sharpness(double, double) { return 0.0; }

}  // namespace

SigmoidFamily atan_family() {
  return {"atan",
          "arctangent",
          "(2/pi) atan(pi z / 2)",
          false,
          1.0,
          1.0,
          value,
          slope,
          by_sharpness,
          "NIST DLMF 4.23.3; slope DLMF 4.24.9 (numbers from memory)"};
}

}  // namespace kneeprint
