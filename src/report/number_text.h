// SPDX-License-Identifier: GPL-3.0-or-later
// Numbers as a reader should see them: no more digits than the uncertainty supports, a true minus
// sign.
#pragma once

#include <optional>
#include <string>

#include "curve/points.h"
#include "sigmoid/fit.h"

namespace kneeprint {

/// Decimals at which an expanded uncertainty (> 0) shows two significant digits (GUM 7.2.6: one or
/// two; two are kept), 0 .. 9.
int decimals_for(double expanded_u);

/// "-3.21": fixed decimals; "0.00" never carries a minus.
std::string fixed_text(double value, int decimals);
/// At most `digits` significant digits, no exponent between 1e-6 and 1e6.
std::string short_text(double value, int digits = 4);

/// "-3.21 +- 0.05"; without an uncertainty (or at 0) `decimals`; an empty value gives a dash.
std::string with_u(const Cell& value, const Cell& expanded_u, int decimals = 2);

/// "0.512 (0.503 to 0.521)", digits after the interval's half width.
std::string with_interval(const FittedParameter& p);

/// "997 Hz", "4.99 kHz": 3 significant digits, for headings and labels.
std::string frequency_text(double hz);

inline const char* const kDash = "\u2013";
inline const char* const kMinus = "\u2212";

}  // namespace kneeprint
