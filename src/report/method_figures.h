// SPDX-License-Identifier: GPL-3.0-or-later
// Figures of the methods beyond the ladder's own: swept responses, the gliding level, bands of the
// multitone, recovery after a burst. One without data is left out.
#pragma once

#include <vector>

#include "report/report.h"

namespace kneeprint {

std::vector<Figure> method_figures(const ReportData& data);

}  // namespace kneeprint
