// SPDX-License-Identifier: GPL-3.0-or-later
#include "report/report.h"

#include <cmath>
#include <set>

#include "doctest/doctest.h"
#include "figure/markup_check.h"
#include "quantity/failure.h"
#include "report/report_sections.h"
#include "report/sample_report.h"

namespace kneeprint {
namespace {

bool holds(const std::string& text, const std::string& part) {
  return text.find(part) != std::string::npos;
}

/// Nothing in it that a page should warn of.
ReportData clean() {
  ReportData d = SampleReport().make();
  d.rig.invented = false;
  d.rig.kind = RigKind::live;
  return d;
}

std::set<std::string> notices(const ReportData& d) {
  std::set<std::string> titles;
  for (const auto& block : notices_section(d).blocks) titles.insert(std::get<Notice>(block).title);
  return titles;
}

using Titles = std::set<std::string>;

TEST_CASE("the page is well-formed and self-contained") {
  for (const auto& data :
       {clean(), SampleReport({10, 10, 1, 11, 0.14, 0.22, false}).make(), ReportData{}}) {
    const std::string html = html_report(data);
    CHECK(html.rfind("<!DOCTYPE html>", 0) == 0);
    CHECK(markup_fault(html) == "");
    CHECK_FALSE(holds(html, "<script"));
    CHECK_FALSE(holds(html, "<link"));
    CHECK_FALSE(holds(html, "<img"));
    CHECK_FALSE(holds(html, "@import"));
    CHECK(count_of(html, "http") == count_of(html, "<svg xmlns=\"http://www.w3.org/2000/svg\""));
    CHECK(count_of(html, "<svg ") == report_figures(data).size());
    const auto ids = ids_of(html);
    CHECK(std::set<std::string>(ids.begin(), ids.end()).size() == ids.size());
    CHECK_FALSE(holds(html, "nan"));
  }
}

TEST_CASE("every section stands on a full page") {
  const std::string html = html_report(clean());
  for (const char* title :
       {"What was measured and how", "In figures", "Curves", "The fitted curve",
        "Hold-out: two tones", "Every level", "Definitions", "Cautions", "Glossary"})
    CHECK(holds(html, title));
  CHECK(holds(html, "if the family holds"));
  CHECK(holds(html, "no shield electrode"));
}

TEST_CASE("user text is escaped wherever it stands") {
  ReportData d = clean();
  d.journal.begin.unit = "<b>5 & \"6\"</b>\x01\xff";
  d.rig.name = "<i>rig</i>";
  d.rig.wiring = "<u>";
  d.plan.name = "<s>plan";
  d.why_no_model = "<em>why";
  d.model.reset();
  const std::string html = html_report(d);
  CHECK(markup_fault(html) == "");
  for (const char* tag : {"<b>", "<i>", "<u>", "<s>", "<em>"}) CHECK_FALSE(holds(html, tag));
  CHECK(holds(html, "&lt;b&gt;5 &amp; &quot;6&quot;&lt;/b&gt;"));
}

TEST_CASE("a clean measurement has no notice") { CHECK(notices(clean()).empty()); }

TEST_CASE("each notice stands when it applies, alone") {
  const auto with = [](const auto& change) {
    ReportData d = clean();
    change(d);
    return notices(d);
  };
  CHECK(with([](ReportData& d) { d.rig.invented = true; }) == Titles{"Invented data."});
  CHECK(with([](ReportData& d) { d.rig.return_scale = {}; }) == Titles{"Uncalibrated."});
  CHECK(with([](ReportData& d) {
          d.rig.kind = RigKind::reel;
          d.rig.send_scale = d.rig.return_scale = {};
        }) == Titles{"Uncalibrated reel."});
  CHECK(with([](ReportData& d) {
          d.journal.stops = {{"return-hot", "Hot.", "2026-05-04T10:09:00Z"}};
        }) == Titles{"Ended early."});
  CHECK(with([](ReportData& d) {
          d.journal.stops = {{"thd", "THD.", "2026-05-04T10:09:00Z"}};
        }) == Titles{"Ladder ended below its top."});
  CHECK(with([](ReportData& d) { d.model->frequency_dependent = true; }) ==
        Titles{"Frequency-dependent."});
  CHECK(with([](ReportData& d) { d.model->fit.families[0].extrapolated = true; }) ==
        Titles{"Limit extrapolated."});
  CHECK(with([](ReportData& d) { d.model->fit.families[0].converged = false; }) ==
        Titles{"No family describes this unit."});
  CHECK(with([](ReportData& d) { d.model->polarity = -1; }) == Titles{"Inverting unit."});
  CHECK(with([](ReportData& d) {
          d.model.reset();
          d.why_no_model = "Too few.";
        }) == Titles{"No curve fitted."});
  CHECK(with([](ReportData& d) { d.rig.dc_coupled_return = false; }) == Titles{"No DC."});
  CHECK(with([](ReportData& d) { d.rig.floor = {}; }) == Titles{"Rig floor unknown."});
  CHECK(with([](ReportData& d) { d.curves.levels[0].flag = Flag::clipped; }) ==
        Titles{"Rig clipped."});
  CHECK(with([](ReportData& d) { d.curves.levels[0].flag = Flag::unsteady; }) ==
        Titles{"Unsteady."});
}

TEST_CASE("a stop that was taken up again is no early end") {
  ReportData d = clean();
  d.journal.stops = {{"cancelled", "Stopped by hand.", "2026-05-04T10:00:30Z"}};
  CHECK(notices(d).empty());
  d.journal.stops[0].at = "2026-05-04T10:20:00Z";
  CHECK(notices(d) == Titles{"Ended early."});
}

TEST_CASE("where the unit depends on frequency nothing is called a hold-out") {
  ReportData d = clean();
  d.model->frequency_dependent = true;
  CHECK(holdout_section(d).title == "Two-tone prediction");
  d.model->frequency_dependent = false;
  CHECK(holdout_section(d).title == "Hold-out: two tones");
}

TEST_CASE("DC that an interface cannot see is not stated") {
  ReportData d = clean();
  d.rig.dc_coupled_return = false;
  CHECK(holds(html_report(d), "this interface cannot see DC: use a meter"));
}

TEST_CASE("the crossing table shows what the closed form says") {
  // THD_F = 2 % * (A / A0)^1 with A0 at 0 dBu: 0.1 % at -26.0206 dBu, 1 % at -6.0206 dBu, 3 % at
  // +3.5218 dBu. A power law has no bend in log-log, so +- is the stated 0.1 % of THD in dB:
  // 0.0087.
  ReportData d;
  for (double drive = -39.0; drive <= 3.0; drive += 3.0) {
    LevelPoint p;
    p.frequency_hz = p.asked_hz = 997.0;
    p.drive = drive;
    p.unit = LevelUnit::dbu;
    p.output = drive;
    p.gain_db = 0.0;
    p.thd_f_percent = 2.0 * std::pow(10.0, drive / 20.0);
    p.thd_f_u_percent = 0.001 * *p.thd_f_percent;
    d.curves.levels.push_back(p);
  }
  const Section s = summary_section(d);
  const Table& thd = std::get<Table>(s.blocks.at(0));
  REQUIRE(thd.rows.size() == 1);
  CHECK(thd.rows[0][0] == "997 Hz");
  CHECK(thd.rows[0][1] == "up \u221226.0206 ± 0.0087");
  CHECK(thd.rows[0][2] == "up \u22126.0206 ± 0.0087");
  CHECK(thd.rows[0][3] == "not reached");
  const Table& compression = std::get<Table>(s.blocks.at(1));
  CHECK(compression.rows.at(0) ==
        std::vector<std::string>{"997 Hz", "\u221239.00", "not reached", "not reached", "0.00 dB"});
}

TEST_CASE("a THD above a line all along, and one that dips below it") {
  ReportData d;
  for (double drive : {0.0, 10.0, 20.0}) {
    LevelPoint p;
    p.frequency_hz = 997.0;
    p.drive = drive;
    p.thd_f_percent = drive == 10.0 ? 0.2 : 20.0;
    d.curves.levels.push_back(p);
  }
  const Section s = summary_section(d);
  const auto& row = std::get<Table>(s.blocks.at(0)).rows.at(0);
  CHECK(row[1] == "above throughout");
  // From 20 % to 0.2 % over 10 dB: 1 % at 10 log10(20) / 2 = 6.505 dB.
  CHECK(row[2] == "down 6.51; up 13.49");
}

TEST_CASE("figures come in order, as far as the data reach") {
  const auto ids = [](const ReportData& d) {
    std::vector<std::string> found;
    for (const auto& f : report_figures(d)) found.push_back(f.id);
    return found;
  };
  ReportData d = clean();
  CHECK(ids(d) == std::vector<std::string>{"harmonics", "thd", "compression", "smpte", "ccif",
                                           "transfer", "balance"});
  d.model.reset();
  d.curves.intermods.clear();
  CHECK(ids(d) == std::vector<std::string>{"harmonics", "thd", "compression", "balance"});
  CHECK(report_figures(ReportData{}).empty());
  for (const auto& f : report_figures(clean())) {
    CAPTURE(f.id);
    CHECK_FALSE(f.caption.empty());
    CHECK(f.x.label.find(',') != std::string::npos);  // the unit
    CHECK(f.y.label.find(',') != std::string::npos);
  }
}

TEST_CASE("each pair of tones has a figure of its own") {
  ReportData d = clean();
  const std::vector<IntermodPoint> rows = d.curves.intermods;
  for (IntermodPoint p : rows) {
    if (p.method != "ccif") continue;
    p.f1_hz = 14000.0;
    p.f2_hz = 15000.0;
    if (p.db) *p.db += 20.0;
    d.curves.intermods.push_back(p);
  }
  std::vector<const Figure*> pairs;
  const std::vector<Figure> figures = report_figures(d);
  for (const Figure& f : figures) {
    if (f.id.starts_with("ccif")) pairs.push_back(&f);
  }
  REQUIRE(pairs.size() == 2);
  CHECK(pairs[0]->id == "ccif");
  CHECK(pairs[1]->id == "ccif-2");
  CHECK(holds(pairs[0]->note, "14 kHz and 15 kHz"));
  const auto measured = [](const Figure& f) {
    for (const Series& s : f.series) {
      if (s.label == "d2 measured") return s.points;
    }
    return std::vector<FigurePoint>{};
  };
  const auto low = measured(*pairs[1]), high = measured(*pairs[0]);
  REQUIRE(low.size() == high.size());
  REQUIRE_FALSE(low.empty());
  for (std::size_t i = 0; i < low.size(); ++i) {
    CHECK(high[i].y == doctest::Approx(10.0 * low[i].y));
  }
}

TEST_CASE("square and sine stands with its share of the standard's slope, DIM under its name") {
  ReportData d = clean();
  IntermodPoint p;
  p.method = p.product = "square-sine";
  p.drive = 4.0;
  p.percent = 1.25;
  p.db = -38.06;
  p.expanded_u_db = 0.1;
  d.curves.intermods.push_back(p);
  const auto scalar = [&](const char* method, const char* figure, const char* state, double value,
                          Cell drive) {
    ScalarPoint s;
    s.method = method;
    s.figure = figure;
    s.state = state;
    s.value = value;
    s.drive = drive;
    s.value_unit = "1";
    d.curves.scalars.push_back(s);
  };
  scalar("square-sine", "slope-fraction", "dim-30", 0.238, 4.0);
  scalar("square-sine", "slope-fraction", "dim-100", 0.0715, 4.0);
  scalar("square-sine", "band-limit", "-", 40976.0, 4.0);
  scalar("dim-30", "dim", "-", 2.7, {});
  const Section s = programme_section(d);
  const auto& table = std::get<Table>(s.blocks.back());
  REQUIRE(table.rows.size() == 2);
  CHECK(table.rows[0][0] == "square and sine");
  CHECK(holds(table.rows[0][2], "1.25"));
  CHECK(table.rows[0][3] == "0.24");
  CHECK(table.rows[0][4] == "0.07");
  CHECK(table.rows[0][5] == "41.0");
  CHECK(table.rows[1][0] == "DIM 30, external generator");
  CHECK(holds(table.rows[1][2], "2.7"));
}

TEST_CASE("noise is drawn as an upper limit, other doubt hollow") {
  ReportData d = clean();
  int limits = 0, expected = 0;
  for (auto& h : d.curves.harmonics)
    if (h.frequency_hz == 997.0 && h.order == 3 && h.flag == Flag::none) h.flag = Flag::floor;
  for (const auto& h : d.curves.harmonics)
    expected += h.frequency_hz == 997.0 && h.order >= 2 && h.flag == Flag::noise;
  const Figure f = report_figures(d).front();
  for (const auto& s : f.series)
    for (const auto& p : s.points) {
      limits += p.upper_limit;
      CHECK(p.doubtful == (s.label == "H3" && !p.upper_limit));
    }
  CHECK(expected > 0);
  CHECK(limits == expected);
}

TEST_CASE("the transfer figure marks rest and the centre of symmetry at -bias / drive") {
  const auto figures = report_figures(clean());
  const Figure& f = figures.at(5);
  REQUIRE(f.id == "transfer");
  const Series *rest = nullptr, *centre = nullptr, *curve = nullptr;
  for (const auto& s : f.series) {
    if (s.label == "rest") rest = &s;
    if (s.label == "centre of symmetry") centre = &s;
    if (s.label == "curve") curve = &s;
  }
  REQUIRE(rest);
  REQUIRE(centre);
  REQUIRE(curve);
  CHECK(rest->points.at(0).x == 0.0);
  CHECK(rest->points.at(0).y == 0.0);
  CHECK(centre->points.at(0).x == doctest::Approx(-0.22 / 0.14));
  CHECK(centre->points.at(0).y == doctest::Approx(-11.0 * std::tanh(0.22)));
  // Driven to +22 dBu: 2 dB under a full-scale sine of 12.2765 V rms.
  CHECK(curve->points.back().x ==
        doctest::Approx(12.276529880 * std::sqrt(2.0) * std::pow(10.0, -0.1)).epsilon(1e-6));
}

TEST_CASE("pages repeat byte for byte") {
  const ReportData d = clean();
  CHECK(html_report(d) == html_report(d));
  const std::string pdf = pdf_report(d);
  CHECK(pdf == pdf_report(d));
  CHECK(pdf.rfind("%PDF-", 0) == 0);
  CHECK(holds(pdf, "20260504100000"));  // the journal's start is its date
  CHECK(pdf_report(ReportData{}) == pdf_report(ReportData{}));
}

TEST_CASE("a PDF that cannot be written says where") {
  CHECK_THROWS_AS(write_pdf_report(ReportData{}, "no-such-folder/report.pdf"), InputError);
}

}  // namespace
}  // namespace kneeprint
