// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/utf8.h"

#include "doctest/doctest.h"

namespace kneeprint {
namespace {

TEST_CASE("valid text passes, controls become spaces, stray bytes U+FFFD") {
  CHECK(printable_utf8("Röhre 12AX7 µ·Ω 🎚") == "Röhre 12AX7 µ·Ω 🎚");
  CHECK(printable_utf8("a\tb\nc\x7f") == "a b c ");
  CHECK(printable_utf8("a\xff") == "a\uFFFD");
  CHECK(printable_utf8("\xc3") == "\uFFFD");            // cut short
  CHECK(printable_utf8("\xc0\xaf") == "\uFFFD\uFFFD");  // overlong '/'
  CHECK(printable_utf8("\xe0\x80\xaf") == "\uFFFD\uFFFD\uFFFD");
  CHECK(printable_utf8("\xed\xa0\x80") == "\uFFFD\uFFFD\uFFFD");            // surrogate
  CHECK(printable_utf8("\xf4\x90\x80\x80") == "\uFFFD\uFFFD\uFFFD\uFFFD");  // above U+10FFFF
}

TEST_CASE("letters and words") {
  CHECK(split_letters("aµΩ") == std::vector<std::string>{"a", "µ", "Ω"});
  CHECK(split_words("  one two\n three ") == std::vector<std::string>{"one", "two", "three"});
  CHECK(split_words("").empty());
}

}  // namespace
}  // namespace kneeprint
