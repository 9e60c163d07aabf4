// SPDX-License-Identifier: GPL-3.0-or-later
// The parts of a report, each a section of the page; a section without blocks is left out.
#pragma once

#include "report/page.h"
#include "report/report.h"

namespace kneeprint {

Section notices_section(const ReportData& data);  ///< only those that apply
Section setup_section(const ReportData& data);    ///< what was measured and how
Section summary_section(const ReportData& data);  ///< crossings and compression points
Section figures_section(const ReportData& data);
Section model_section(const ReportData& data);  ///< parameters and families
Section holdout_section(const ReportData& data);
Section holdout_points_section(const ReportData& data);  ///< every pair of the hold-out
Section levels_section(const ReportData& data);          ///< every rung
Section noise_section(const ReportData& data);
Section programme_section(const ReportData& data);  ///< multitone and fill
Section memory_section(const ReportData& data);     ///< drift, loops, recovery
Section products_section(const ReportData& data);   ///< of two tones, at the highest drives
Section definitions_section();
Section cautions_section();
Section glossary_section();

}  // namespace kneeprint
