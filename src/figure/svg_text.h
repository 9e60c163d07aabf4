// SPDX-License-Identifier: GPL-3.0-or-later
// SVG as text: made fit to stand inside a page, next to others.
#pragma once

#include <string>
#include <string_view>

namespace kneeprint {

/// & < > " ' as references, control characters as spaces, invalid UTF-8 as U+FFFD: safe as XML or
/// HTML text and inside a quoted attribute.
std::string escape_markup(std::string_view text);

/// What Cairo wrote, as an <svg> element for HTML: no prologue; width 100 %; ids numbered in order
/// of appearance behind `id`, so that pages repeat byte for byte and figures do not clash; a title
/// for readers who listen.
std::string embeddable_svg(const std::string& cairo_text, const std::string& id,
                           const std::string& title, double width, double height);

}  // namespace kneeprint
