// SPDX-License-Identifier: GPL-3.0-or-later
// Figures and tables of the methods beyond the ladder's own.
#include <doctest/doctest.h>

#include <cmath>
#include <string>

#include "report/method_figures.h"
#include "report/report_sections.h"
#include "report/sample_report.h"
#include "report/surface_figures.h"

namespace kneeprint {
namespace {

const Figure* find(const std::vector<Figure>& figures, const std::string& id) {
  for (const Figure& f : figures) {
    if (f.id == id) return &f;
  }
  return nullptr;
}

ScalarPoint scalar(const std::string& method, const std::string& figure, const std::string& state,
                   double value, const std::string& unit, Flag flag = Flag::none) {
  ScalarPoint p;
  p.method = method;
  p.figure = figure;
  p.state = state;
  p.value = value;
  p.value_unit = unit;
  p.expanded_u = 0.04;
  p.flag = flag;
  return p;
}

std::string text_of(const Section& s) {
  std::string text;
  for (const Block& block : s.blocks) {
    if (const auto* table = std::get_if<Table>(&block)) {
      for (const auto& row : table->rows) {
        for (const auto& cell : row) text += cell + "|";
        text += "\n";
      }
    }
  }
  return text;
}

}  // namespace

TEST_CASE("without their data there are no such figures and sections") {
  const ReportData empty;
  CHECK(method_figures(empty).empty());
  CHECK(surface_figures(empty).empty());
  CHECK(noise_section(empty).blocks.empty());
  CHECK(programme_section(empty).blocks.empty());
  CHECK(memory_section(empty).blocks.empty());
  CHECK(products_section(empty).blocks.empty());
}

TEST_CASE("a swept response is drawn per drive, harmonics over their fundamental") {
  ReportData data;
  for (const double drive : {-20.0, 0.0}) {
    for (int i = 0; i < 10; ++i) {
      for (int order = 1; order <= 2; ++order) {
        ResponsePoint p;
        p.method = "sweep";
        p.frequency_hz = 100.0 * (i + 1);
        p.drive = drive;
        p.order = order;
        p.magnitude_db = order == 1 ? 3.0 : -57.0;
        // At the low drive most of H2 is under the noise, at the high one a single point is.
        if (order == 2 && (drive < 0.0 ? i > 2 : i == 4)) p.flag = Flag::noise;
        data.curves.responses.push_back(p);
      }
    }
  }
  const auto figures = method_figures(data);
  const Figure* first = find(figures, "response-h1");
  REQUIRE(first != nullptr);
  CHECK(first->series.size() == 2);
  CHECK(first->series[0].points[0].y == 3.0);
  const Figure* second = find(figures, "response-h2");
  REQUIRE(second != nullptr);
  REQUIRE(second->series.size() == 1);
  CHECK(second->series[0].points[0].y == -60.0);
  CHECK(std::isnan(second->series[0].points[4].y));  // the pen is lifted there
  CHECK(find(figures, "response-h3") == nullptr);
}

TEST_CASE("noise, multitone and memory: values with their uncertainty, limits as limits") {
  ReportData data;
  data.curves.scalars = {scalar("silence", "noise", "drive-free", -89.02, "dBu"),
                         scalar("silence", "noise", "idle-with-bias", -88.5, "dBu"),
                         scalar("silence", "hum-total", "drive-free", -117.8, "dBu", Flag::noise),
                         scalar("reference", "gain-drift", "-", 0.02, "dB", Flag::noise)};
  ScalarPoint fill = scalar("multitone", "fill", "80 dB SPL", 65.0, "%");
  fill.drive = 18.0;
  data.curves.scalars.push_back(fill);
  const std::string noise = text_of(noise_section(data));
  CHECK(noise.find("dBu|\u221289.020 ± 0.040|\u221288.500 ± 0.040|") != noise.npos);
  CHECK(noise.find("< \u2212118") != noise.npos);
  CHECK(text_of(memory_section(data)).find("< 0.02") != std::string::npos);
  const std::string programme = text_of(programme_section(data));
  CHECK(programme.find("18.00|") != programme.npos);
  CHECK(programme.find("65.00 ± 0.04|") != programme.npos);
}

TEST_CASE("products say what they fall on") {
  ReportData data;
  ProductPoint p;
  p.method = "ccif";
  p.k1 = 2;
  p.k2 = -1;
  p.order = 3;
  p.frequency_hz = 18000.0;
  p.relative_db = -60.0;
  p.expanded_u_db = 0.1;
  p.note = "falls on 2f2-f1";
  data.curves.products.push_back(p);
  const std::string text = text_of(products_section(data));
  CHECK(text.find("ccif|2f1 \u2212 f2|18000.0|") != text.npos);
  CHECK(text.find("falls on 2f2-f1") != text.npos);
}

TEST_CASE("a grid of frequencies and drives is drawn as maps") {
  ReportData data;
  for (const double hz : {50.0, 100.0, 200.0, 400.0}) {
    for (const double drive : {-20.0, -10.0, 0.0}) {
      LevelPoint p;
      p.frequency_hz = p.asked_hz = hz;
      p.drive = drive;
      p.output = drive;
      p.thd_f_percent = std::pow(10.0, drive / 20.0);
      p.flag = drive < -15.0 ? Flag::noise : Flag::none;
      data.curves.levels.push_back(p);
    }
  }
  const auto maps = surface_figures(data);
  const Figure* thd = find(maps, "surface-thd");
  REQUIRE(thd != nullptr);
  CHECK(thd->surface->cells.size() == 12);
  int limits = 0;
  for (const SurfaceCell& c : thd->surface->cells) {
    limits += c.upper_limit;
    CHECK(c.upper_limit == (c.text.front() == '<'));
  }
  CHECK(limits == 4);
  data.curves.levels.resize(9);  // three frequencies: lines against drive say more
  CHECK(surface_figures(data).empty());
}

}  // namespace kneeprint
