// SPDX-License-Identifier: GPL-3.0-or-later
// A measurement over a grid of frequencies and drives, as maps.
#pragma once

#include <vector>

#include "report/report.h"

namespace kneeprint {

/// THD_F, H2, H3 and compression over frequency and drive. Empty where fewer than four frequencies
/// or three rungs were measured: lines against drive say more then.
std::vector<Figure> surface_figures(const ReportData& data);

}  // namespace kneeprint
