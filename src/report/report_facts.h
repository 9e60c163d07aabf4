// SPDX-License-Identifier: GPL-3.0-or-later
// Short facts that several parts of the page name in the same words.
#pragma once

#include <array>
#include <string>

#include "report/report.h"

namespace kneeprint {

inline constexpr std::array kThdMarks{0.1, 1.0, 3.0};     ///< percent
inline constexpr std::array kCompressionMarks{1.0, 3.0};  ///< dB

/// The unit's text as given, or "unnamed unit".
std::string unit_name(const ReportData& data);
/// The same, cut to 60 letters for notes under figures.
std::string unit_label(const ReportData& data);
/// "dBu", "dBFS".
std::string drive_unit(const ReportData& data);
/// "virtual rig", "reel, uncalibrated", ...: for notes under titles.
std::string rig_line(const Rig& rig);
/// Unit and rig.
std::string conditions_line(const ReportData& data);
/// As played: the model's, else the one nearest to the plan's choice, or to 997 Hz. 0 without
/// levels.
double fit_frequency(const ReportData& data);
bool calibrated(const Rig& rig);  ///< both directions
/// The chosen family's predictions; nullptr without.
const HoldoutFamily* best_holdout(const ReportData& data);
const FittedFamily* best_family(const ReportData& data);

}  // namespace kneeprint
