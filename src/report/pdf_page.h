// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>

#include "report/page.h"

namespace kneeprint {

/// The page on A4 as the bytes of a PDF. The same page gives the same bytes: the only date in it is
/// page.created.
std::string pdf_page(const Page& page);

}  // namespace kneeprint
