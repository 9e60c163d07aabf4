// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/cairo_text.h"

#include <cairo.h>

#include "doctest/doctest.h"

namespace kneeprint {
namespace {

class Ruler {
 public:
  Ruler()
      : surface_(cairo_image_surface_create(CAIRO_FORMAT_A8, 8, 8)), cr_(cairo_create(surface_)) {}
  ~Ruler() {
    cairo_destroy(cr_);
    cairo_surface_destroy(surface_);
  }
  Ruler(const Ruler&) = delete;
  Ruler& operator=(const Ruler&) = delete;
  operator cairo_t*() { return cr_; }

 private:
  cairo_surface_t* surface_;
  cairo_t* cr_;
};

TEST_CASE("wrapped lines fit, and together are the text") {
  Ruler cr;
  const TextStyle style{10.0, false, false, kInk};
  const std::string text = "The rms of everything from 20 Hz to 20 kHz but the fundamental";
  const auto lines = wrap_text(cr, text, 90.0, style);
  CHECK(lines.size() > 2);
  std::string joined;
  for (const auto& line : lines) {
    CHECK(text_width(cr, line, style) <= 90.0);
    joined += (joined.empty() ? "" : " ") + line;
  }
  CHECK(joined == text);
}

TEST_CASE("a word wider than the line is broken between letters, none lost") {
  Ruler cr;
  const TextStyle style{10.0, false, false, kInk};
  std::string word;
  for (int i = 0; i < 60; ++i) word += "Ω";
  const auto lines = wrap_text(cr, "a " + word, 90.0, style);
  std::string joined;
  for (const auto& line : lines) {
    CHECK(text_width(cr, line, style) <= 90.0);
    joined += line;
  }
  CHECK(joined == "a" + word);
  CHECK(wrap_text(cr, "", 90.0, style) == std::vector<std::string>{""});
}

TEST_CASE("text too wide for its place is closed with an ellipsis") {
  Ruler cr;
  const TextStyle style{10.0, true, false, kInk};
  CHECK(fit_text(cr, "short", 200.0, style) == "short");
  const std::string cut = fit_text(cr, "a rather long name of a unit", 60.0, style);
  CHECK(text_width(cr, cut, style) <= 60.0);
  CHECK(cut.substr(cut.size() - 3) == "\u2026");
}

}  // namespace
}  // namespace kneeprint
