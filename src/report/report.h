// SPDX-License-Identifier: GPL-3.0-or-later
// The page: what was measured and how, cautions, figures, tables, the fitted curve.
#pragma once

#include <filesystem>
#include <map>
#include <optional>
#include <string>
#include <vector>

#include "curve/points.h"
#include "figure/figure.h"
#include "print/journal.h"
#include "print/plan.h"
#include "rig/rig_file.h"
#include "sigmoid/model.h"

namespace kneeprint {

struct ReportData {
  Plan plan;
  Rig rig;
  Journal journal;
  Curves curves;
  std::optional<Model> model;  ///< empty when nothing could be fitted; `why_no_model` then says why
  std::string why_no_model;
  std::map<std::string, std::string> method_titles;  ///< by id
};

/// The figures of the page, in order, as far as the data reach.
std::vector<Figure> report_figures(const ReportData& data);

/// Self-contained: inline SVG, no script, no font or picture from elsewhere.
std::string html_report(const ReportData& data);
/// The same content on A4 pages, as the bytes of a PDF. The same data give the same bytes: its date
/// is the journal's start.
std::string pdf_report(const ReportData& data);
/// Throws InputError naming the file when it cannot be written.
void write_pdf_report(const ReportData& data, const std::filesystem::path& file);

}  // namespace kneeprint
