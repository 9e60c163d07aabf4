// SPDX-License-Identifier: GPL-3.0-or-later
#include "report/report.h"

#include <fmt/format.h>

#include <fstream>

#include "quantity/failure.h"
#include "report/html_page.h"
#include "report/pdf_page.h"
#include "report/report_facts.h"
#include "report/report_sections.h"

namespace kneeprint {
namespace {

std::string subtitle(const ReportData& data) {
  const auto& begin = data.journal.begin;
  return fmt::format("{} · {} · plan {} · {}",
                     begin.started.empty() ? "date not stated" : begin.started.substr(0, 10),
                     data.rig.name.empty() ? rig_line(data.rig) : data.rig.name,
                     data.plan.name.empty() ? "without a name" : data.plan.name,
                     begin.program.empty() ? "kneeprint" : begin.program);
}

/// The parts in reading order: what limits trust comes first.
Page report_page(const ReportData& data) {
  Page page;
  page.title = "Kneeprint of " + unit_name(data);
  page.subtitle = subtitle(data);
  page.created = data.journal.begin.started;
  page.sections = {notices_section(data), setup_section(data),    summary_section(data),
                   figures_section(data), noise_section(data),    programme_section(data),
                   memory_section(data),  model_section(data),    holdout_section(data),
                   levels_section(data),  products_section(data), holdout_points_section(data),
                   definitions_section(), cautions_section(),     glossary_section()};
  page.footer =
      "Tables behind this page: curves/*.csv. The fit: model.json. The takes and their checksums: "
      "journal.jsonl.";
  return page;
}

}  // namespace

std::string html_report(const ReportData& data) { return html_page(report_page(data)); }

std::string pdf_report(const ReportData& data) { return pdf_page(report_page(data)); }

void write_pdf_report(const ReportData& data, const std::filesystem::path& file) {
  const std::string bytes = pdf_report(data);
  std::ofstream out(file, std::ios::binary | std::ios::trunc);
  out.write(bytes.data(), static_cast<std::streamsize>(bytes.size()));
  out.close();
  if (!out)
    throw InputError(file.string() + ": cannot write the PDF report; expected a writable file");
}

}  // namespace kneeprint
