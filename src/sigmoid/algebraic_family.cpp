// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/algebraic_family.h"

#include <cmath>

namespace kneeprint {
namespace {

// ln(1 + |z|^p), with |z|^p taken out where it dominates, so that no power overflows.
double log_one_plus_power(double log_z, double p) {
  const double t = p * log_z;
  return t > 0.0 ? t + std::log1p(std::exp(-t)) : std::log1p(std::exp(t));
}

double value(double z, double p) {
  if (z == 0.0) return 0.0;
  const double magnitude = std::abs(z);
  const double log_z = std::log(magnitude);
  // Beyond 1, S = (1 + |z|^-p)^(-1/p).
  if (magnitude > 1.0) return std::copysign(std::exp(-log_one_plus_power(-log_z, p) / p), z);
  return z * std::exp(-log_one_plus_power(log_z, p) / p);
}

double slope(double z, double p) {
  if (z == 0.0) return 1.0;
  return std::exp(-(1.0 + 1.0 / p) * log_one_plus_power(std::log(std::abs(z)), p));
}

// d/dp ln S = ln(1 + w) / p^2 - w ln|z| / (p (1 + w)) with w = |z|^p. Beyond 1, ln(1 + w) is
// p ln|z| + ln(1 + 1/w), and the p ln|z| / p^2 cancels all but 1 / (1 + w) of the second term.
double by_sharpness(double z, double p) {
  if (z == 0.0) return 0.0;
  const double log_z = std::log(std::abs(z));
  const double t = -p * std::abs(log_z);  // min(w, 1/w) = exp(t)
  const double l = std::log1p(std::exp(t));
  const double share = std::exp(t) / (1.0 + std::exp(t));
  return value(z, p) * (l / (p * p) + share * std::abs(log_z) / p);
}

}  // namespace

SigmoidFamily algebraic_family() {
  return {"algebraic",
          "algebraic",
          "z / (1 + |z|^p)^(1/p)",
          true,
          1.0,
          40.0,
          value,
          slope,
          by_sharpness,
          "elementary; slope and dS/dp derived, checked against finite differences"};
}

}  // namespace kneeprint
