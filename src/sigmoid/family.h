// SPDX-License-Identifier: GPL-3.0-or-later
// Sigmoid families: y = limit * (S(drive * x + bias) - S(bias)), S odd and monotonic, S'(0) = 1,
// S(+-inf) = +-1. x, y in volts (full scales when uncalibrated); drive in 1/x; bias plain; limit as
// y. One pair of files and one registry line per family.
#pragma once

#include <span>
#include <string_view>

namespace kneeprint {

struct SigmoidFamily {
  std::string_view id;                   ///< stored in files
  std::string_view title;                ///< for pages
  std::string_view formula;              ///< for pages, plain text
  bool has_sharpness;                    ///< p counts
  double sharpness_low, sharpness_high;  ///< range of p; 1 and 1 without
  /// S(z), S'(z) and dS/dp at sharpness p (p ignored and dS/dp 0 without sharpness). Any finite z.
  double (*value)(double z, double p);
  double (*slope)(double z, double p);
  double (*by_sharpness)(double z, double p);
  std::string_view source;
};

/// Every family, in the order of pages: tanh, atan, algebraic, erf.
std::span<const SigmoidFamily> sigmoid_families();
/// nullptr when unknown.
const SigmoidFamily* find_family(std::string_view id);

struct SigmoidParameters {
  double limit = 1.0, drive = 1.0, bias = 0.0, sharpness = 1.0;
};

/// The transfer curve.
double evaluate(const SigmoidFamily& family, const SigmoidParameters& p, double x);

}  // namespace kneeprint
