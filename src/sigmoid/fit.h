// SPDX-License-Identifier: GPL-3.0-or-later
// The sigmoid found from the harmonics of all levels at one frequency, and how sure it is.
//
// Each family is fitted by weighted least squares (harmonic_problem.h). What a family cannot reach
// is its discrepancy d, a standard deviation relative to the distortion D of each drive (rss of the
// measured orders 2 and up), found together with the curve by maximum likelihood: the least of
//   -2 ln L = sum of (H_n - value)^2 / (u^2 + (d D)^2) + ln(u^2 + (d D)^2).
// Relative to the distortion, so that a whisper counts as much as the limit: a wrong shape misses a
// share of what each drive adds. It stays 0 unless it lowers AICc, in which it counts as a
// parameter. Standard errors come from the inverse Fisher matrix at the final weights; 95 %
// intervals are normal, for limit, drive and sharpness in the logarithm. They hold if the family
// holds.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "sigmoid/family.h"

namespace kneeprint {

/// One harmonic at one drive, from the upright output.
struct FitDatum {
  double input_peak = 0.0;  ///< x amplitude: volts peak (or full scales)
  int order = 1;            ///< 0 for the offset, where the return passes DC
  double value = 0.0;       ///< signed peak when `has_sign`, else magnitude
  double u = 0.0;           ///< standard uncertainty, > 0
  /// Phase within 20 degrees of the axis, or the datum is an in-phase part under noise.
  bool has_sign = true;
  /// The part of u that every drive of this order has in common: the rig's own harmonic, of known
  /// size and unknown phase. It does not average out over the drives.
  double common_u = 0.0;
};

struct FitOptions {
  /// Standard uncertainty of x's scale, relative (type B, all drives alike).
  double send_relative_u = 0.0;
  double return_relative_u = 0.0;  ///< of y's scale
};

struct FittedParameter {
  double value = 0.0;
  double standard_error = 0.0;  ///< fit and scale terms combined
  double low95 = 0.0, high95 = 0.0;
};

struct FittedFamily {
  const SigmoidFamily* family = nullptr;
  FittedParameter limit, drive, bias;
  std::optional<FittedParameter> sharpness;
  double chi_square = 0.0;  ///< with measurement uncertainty alone
  int data = 0, parameters = 0;
  double discrepancy =
      0.0;            ///< standard deviation of what the family cannot reach, over the distortion
  double aicc = 0.0;  ///< -2 ln L (with the discrepancy in L) + 2k + 2k(k+1)/(n-k-1)
  /// Half the fitted curve's swing at the strongest input over the limit, 0 .. 1.
  double reach = 0.0;
  bool extrapolated = false;  ///< reach < 0.8: the limit was never approached
  bool converged = false;     ///< and not at the end of the range searched for drive or bias

  SigmoidParameters point() const;
  /// False when more than half of the distortion is missed, or the fit has run away: then the
  /// parameters are no description of the unit, whatever their AICc.
  bool describes() const { return converged && discrepancy <= 0.5; }
};

struct FitResult {
  std::vector<FittedFamily> families;  ///< in registry order
  std::size_t best = 0;  ///< lowest AICc among those that describe the unit, else of all
  std::vector<std::size_t> equally_good;  ///< within 2 of the best, the best included
  /// Where the limit may be: the best family's 95 % interval, widened to hold the limit of every
  /// family not rejected (AICc within 10 of the best).
  double limit_low = 0.0, limit_high = 0.0;
};

/// Every family fitted by Ceres from several starts. Throws NothingUsable with fewer than 8 data or
/// fewer than 3 drives, or when no curve fits (nothing but zeros, an inverted output); InputError
/// naming a datum that is out of range (input, u > 0 and finite, order 0 to 1000).
FitResult fit_sigmoids(const std::vector<FitDatum>& data, const FitOptions& options);

}  // namespace kneeprint
