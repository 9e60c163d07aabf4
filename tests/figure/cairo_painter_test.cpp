// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/cairo_painter.h"

#include <array>
#include <cmath>
#include <set>

#include "doctest/doctest.h"
#include "figure/markup_check.h"
#include "quantity/failure.h"

namespace kneeprint {
namespace {

Figure sample(const std::string& id) {
  Figure f;
  f.id = id;
  f.title = "Harmonics <of> \"a\" & b";
  f.note = "unit · 997 Hz";
  f.x.label = "drive, dBu";
  f.y.label = "level, dB";
  for (int n = 0; n < 4; ++n) {
    Series s;
    s.label = std::array{"H2", "H3", "H4", "H5"}[static_cast<std::size_t>(n)];
    s.style = static_cast<SeriesStyle>(n);
    s.colour = n;
    for (int i = 0; i <= 10; ++i) {
      FigurePoint p;
      p.x = -30.0 + 4.0 * i;
      p.y = -90.0 + 5.0 * i - 3.0 * n;
      p.low = p.y - 10.0;
      p.high = p.y + 10.0;
      p.upper_limit = i < 2;
      p.doubtful = i == 5;
      s.points.push_back(p);
    }
    f.series.push_back(s);
  }
  FigurePoint floor;
  floor.high = -95.0;
  f.bands.push_back({"rig floor", {floor, floor}});
  f.bands[0].points[1].x = 10.0;
  f.marks = {{"-60 dB", false, -60.0}, {"here", true, -10.0}, {"out of sight", true, 500.0}};
  return f;
}

TEST_CASE(
    "the SVG is well-formed, named for readers who listen, and needs nothing from elsewhere") {
  const std::string text = svg(sample("harmonics"));
  CHECK(markup_fault(text) == "");
  CHECK(text.rfind("<svg ", 0) == 0);
  CHECK(text.find("role=\"img\"") != std::string::npos);
  CHECK(text.find("aria-label=\"Harmonics &lt;of&gt; &quot;a&quot; &amp; b\"") !=
        std::string::npos);
  CHECK(count_of(text, "http") == 1);  // the SVG namespace
  CHECK(text.find("<script") == std::string::npos);
  CHECK(text.find("<image") == std::string::npos);
}

TEST_CASE("the same figure gives the same bytes, whatever was drawn in between") {
  const std::string first = svg(sample("a"));
  svg(sample("b"));
  CHECK(svg(sample("a")) == first);
}

TEST_CASE("figures on one page share no id, and every reference has its target") {
  const std::string page = svg(sample("a")) + svg(sample("b"));
  const auto ids = ids_of(page);
  const std::set<std::string> unique(ids.begin(), ids.end());
  CHECK(ids.size() > 4);
  CHECK(unique.size() == ids.size());
  for (const char* key : {"href=\"#", "url(#"})
    for (std::size_t at = page.find(key); at != std::string::npos; at = page.find(key, at + 1)) {
      const std::size_t start = at + std::string(key).size();
      CHECK(unique.count(page.substr(start, page.find_first_of("\")", start) - start)) == 1);
    }
}

TEST_CASE("figures without points, with lone points and with unusable ones can be drawn") {
  Figure empty;
  empty.id = "empty";
  CHECK(markup_fault(svg(empty)) == "");
  Figure odd = sample("odd");
  odd.y.logarithmic = true;  // every value is below 0
  odd.series[0].points[0].x = NAN;
  odd.series[1].points[1].y = INFINITY;
  odd.series[2].points.resize(1);
  const std::string text = svg(odd);
  CHECK(markup_fault(text) == "");
  CHECK(text.find("nan") == std::string::npos);
  CHECK(text.find("inf") == std::string::npos);
}

TEST_CASE("a picture that cannot be written says so") {
  CHECK_THROWS_AS(write_png(sample("a"), "no-such-folder/figure.png"), InputError);
}

}  // namespace
}  // namespace kneeprint
