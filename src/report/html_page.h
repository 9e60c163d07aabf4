// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>

#include "report/page.h"

namespace kneeprint {

/// Self-contained HTML that is also well-formed XML: inline CSS and SVG, no script, prints on A4.
std::string html_page(const Page& page);

}  // namespace kneeprint
