// SPDX-License-Identifier: GPL-3.0-or-later
// Drift of the gain over the run, from the reference tone between the steps.
//
// The readings of one frequency are tested for scattering more than their own uncertainties say:
// chi-square of the residuals from their weighted mean, at 0.1 % (several frequencies share that).
// A drift that passes enters the other figures as a term: between the extremes that were seen
// nothing is known of the moment at which a step was taken, so a rectangular distribution of half
// width range / 2, standard uncertainty range / (2 sqrt 3) (JCGM 100:2008, 4.3.7).
#pragma once

#include <optional>
#include <vector>

#include "curve/points.h"

namespace kneeprint {

struct Drift {
  double frequency_hz = 0.0;
  int readings = 0;         ///< usable ones, at least 2
  double range_db = 0.0;    ///< highest reading less lowest
  double range_u_db = 0.0;  ///< 95 % expanded, of the range
  double limit_db = 0.0;    ///< 95 % upper limit of the true range
  double u_db = 0.0;        ///< standard uncertainty that a significant drift adds
  double chi_square = 0.0;
  bool significant = false;
};

/// One per frequency of the reference tone, ascending; frequencies with less than two usable
/// (unflagged, with an uncertainty) readings are left out.
std::vector<Drift> drifts_of(const Curves& curves);

/// The widest of the significant ones; when none is, the widest.
std::optional<Drift> drift_of(const Curves& curves);

/// A significant drift_of() is added in quadrature to the uncertainty of gain, output, harmonics'
/// levels and responses. In every case one row `gain-drift` (dB) per frequency: the range with its
/// uncertainty, or, when the readings do not scatter more than they may, its upper limit under
/// Flag::noise.
void add_drift(Curves& curves);

}  // namespace kneeprint
