// SPDX-License-Identifier: GPL-3.0-or-later
// What a finished run prints on stdout, as text or as JSON.
#pragma once

#include <filesystem>
#include <string>

#include "run/measure.h"
#include "run/publish.h"

namespace kneeprint::cli {

std::string fit_text(const Model& model);
/// `end` as the climb left it; a reel has none.
std::string result_text(const std::filesystem::path& folder, const Published& published,
                        const ClimbEnd& end, bool json);

}  // namespace kneeprint::cli
