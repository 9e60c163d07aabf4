// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/fit.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "quantity/failure.h"
#include "sigmoid/fit_family.h"

namespace kneeprint {
namespace {

constexpr std::size_t kLeastData = 8;
constexpr std::size_t kLeastDrives = 3;
// Burnham & Anderson, Model Selection and Multimodel Inference (2002), section 2.6: up to 2 above
// the best a model has substantial support, beyond 10 essentially none.
constexpr double kEquallyGood = 2.0;
constexpr double kRejected = 10.0;

void check(const std::vector<FitDatum>& data) {
  const auto refuse = [](std::size_t i, const char* what, double found, const char* expected) {
    throw InputError(
        fmt::format("harmonic {} of the fit: {} is {}; expected {}", i + 1, what, found, expected));
  };
  for (std::size_t i = 0; i < data.size(); ++i) {
    const FitDatum& d = data[i];
    if (!(d.input_peak > 0.0) || !std::isfinite(d.input_peak)) {
      refuse(i, "the input", d.input_peak, "a peak above 0");
    }
    if (!std::isfinite(d.value)) refuse(i, "its value", d.value, "a number");
    if (!(d.u > 0.0) || !std::isfinite(d.u)) refuse(i, "its uncertainty", d.u, "a number above 0");
    if (d.order < 0 || d.order > 1000) refuse(i, "its order", d.order, "0 to 1000");
  }
}

}  // namespace

SigmoidParameters FittedFamily::point() const {
  return {limit.value, drive.value, bias.value, sharpness ? sharpness->value : 1.0};
}

FitResult fit_sigmoids(const std::vector<FitDatum>& data, const FitOptions& options) {
  check(data);
  const HarmonicData harmonics(data);
  if (data.size() < kLeastData || harmonics.rungs().size() < kLeastDrives) {
    throw NothingUsable(fmt::format(
        "too little to fit a curve: {} usable harmonics at {} drives; at least {} at {} "
        "are needed",
        data.size(), harmonics.rungs().size(), kLeastData, kLeastDrives));
  }

  FitResult result;
  for (const SigmoidFamily& family : sigmoid_families()) {
    result.families.push_back(fit_family(family, harmonics, options));
  }
  const auto& families = result.families;
  for (std::size_t i = 1; i < families.size(); ++i) {
    const FittedFamily &one = families[i], &best = families[result.best];
    const bool lower = one.aicc < best.aicc;
    if (one.describes() == best.describes() ? lower : one.describes()) result.best = i;
  }
  const double lowest = families[result.best].aicc;
  result.limit_low = families[result.best].limit.low95;
  result.limit_high = families[result.best].limit.high95;
  for (std::size_t i = 0; i < families.size(); ++i) {
    const double above = families[i].aicc - lowest;
    if (families[i].describes() != families[result.best].describes()) continue;
    if (above <= kEquallyGood) result.equally_good.push_back(i);
    if (above <= kRejected) {
      result.limit_low = std::min(result.limit_low, families[i].limit.value);
      result.limit_high = std::max(result.limit_high, families[i].limit.value);
    }
  }
  return result;
}

}  // namespace kneeprint
