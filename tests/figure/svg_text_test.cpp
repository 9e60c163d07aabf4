// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/svg_text.h"

#include "doctest/doctest.h"
#include "figure/markup_check.h"
#include "quantity/failure.h"

namespace kneeprint {
namespace {

TEST_CASE("markup is escaped") {
  CHECK(escape_markup("<b a=\"1\">'&") == "&lt;b a=&quot;1&quot;&gt;&#39;&amp;");
  CHECK(escape_markup("a\nb\x01\xff") == "a b \uFFFD");
}

TEST_CASE("an embedded drawing has its own ids and no prologue") {
  const std::string raw =
      "<?xml version=\"1.0\"?>\n<svg width=\"9pt\">\n<g id=\"glyph-7\"><path/></g>"
      "<clipPath id=\"clip-9\"/><use xlink:href=\"#glyph-7\"/><g "
      "clip-path=\"url(#clip-9)\"/></svg>\n";
  const std::string text = embeddable_svg(raw, "thd 1", "A < B", 720.0, 440.0);
  CHECK(text.rfind("<svg xmlns=\"http://www.w3.org/2000/svg\"", 0) == 0);
  CHECK(markup_fault(text) == "");
  CHECK(text.find("viewBox=\"0 0 720 440\" width=\"100%\"") != std::string::npos);
  CHECK(text.find("<title>A &lt; B</title>") != std::string::npos);
  CHECK(ids_of(text) == std::vector<std::string>{"thd-1-1", "thd-1-2"});
  CHECK(text.find("href=\"#thd-1-1\"") != std::string::npos);
  CHECK(text.find("url(#thd-1-2)") != std::string::npos);
  CHECK(text.find("xlink") == std::string::npos);
}

TEST_CASE("what is no drawing is refused") {
  CHECK_THROWS_AS(embeddable_svg("", "a", "b", 1, 1), Failure);
}

}  // namespace
}  // namespace kneeprint
