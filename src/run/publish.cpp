// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/publish.h"

#include <fmt/format.h>

#include "curve/csv.h"
#include "curve/hysteresis.h"
#include "print/folder.h"
#include "quantity/failure.h"
#include "report/report.h"
#include "run/describe.h"
#include "run/take_reading.h"

namespace kneeprint {
namespace {

struct Opened {
  PrintFolder folder;
  Plan plan;
  Rig rig;
  Journal journal;
};

Opened open(const std::filesystem::path& path) {
  PrintFolder folder(path);
  if (!folder.exists()) {
    throw InputError(fmt::format("{}: no kneeprint here (no journal.jsonl)", path.string()));
  }
  Plan plan =
      parse_plan(read_text(folder.plan_file()), folder.plan_file().string(), method_needs());
  return {folder, plan, read_rig(folder.rig_file()), read_journal(folder.journal_file(), false)};
}

}  // namespace

int analyse_folder(const std::filesystem::path& path) {
  const Opened o = open(path);
  const Curves curves = read_takes(o.folder, o.journal, o.plan, o.rig);
  for (const CsvTable& table : csv_tables()) {
    o.folder.write_result(o.folder.curves() / table.file, table.text(curves));
  }
  int takes = 0;
  for (const JournalTake& t : o.journal.takes) takes += t.rung >= 0;
  return takes;
}

Model fit_folder(const std::filesystem::path& path) {
  const Opened o = open(path);
  const Model model = describe(ascending(read_curves(o.folder.curves())), o.plan, o.rig);
  o.folder.write_result(o.folder.model_file(), model_json(model));
  return model;
}

void report_folder(const std::filesystem::path& path, const std::string& why_no_model) {
  const Opened o = open(path);
  ReportData data{o.plan,
                  o.rig,
                  o.journal,
                  ascending(read_curves(o.folder.curves())),
                  std::nullopt,
                  why_no_model.empty() ? "no fit was made (run `kneeprint fit`)" : why_no_model,
                  {}};
  for (const Method& m : methods()) data.method_titles.emplace(m.id, m.title);
  if (why_no_model.empty() && std::filesystem::exists(o.folder.model_file())) {
    data.model = read_model(o.folder.model_file());
  }
  o.folder.write_result(o.folder.report_html(), html_report(data));
  o.folder.write_result(o.folder.report_pdf(), pdf_report(data));
}

Published publish_folder(const std::filesystem::path& path, Progress& progress) {
  Published out;
  out.takes = analyse_folder(path);
  try {
    out.model = fit_folder(path);
  } catch (const NothingUsable& e) {
    out.why_no_model = e.what();
    std::filesystem::remove(PrintFolder(path).model_file());  // one of an earlier run would mislead
    progress.say(e.what());
  }
  report_folder(path, out.why_no_model);
  return out;
}

}  // namespace kneeprint
