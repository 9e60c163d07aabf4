// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/erf_family.h"

#include <cmath>
#include <numbers>

namespace kneeprint {
namespace {

const double kHalfRootPi = 0.5 * std::sqrt(std::numbers::pi);

double value(double z, double) { return std::erf(kHalfRootPi * z); }

double slope(double z, double) { return std::exp(-0.25 * std::numbers::pi * z * z); }

double by_sharpness(double, double) { return 0.0; }

}  // namespace

SigmoidFamily erf_family() {
  return {"erf", "error function", "erf(sqrt(pi) z / 2)", false, 1.0, 1.0, value,
          slope, by_sharpness,     "NIST DLMF 7.2.1"};
}

}  // namespace kneeprint
