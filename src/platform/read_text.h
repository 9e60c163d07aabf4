// SPDX-License-Identifier: GPL-3.0-or-later
// A whole file into memory, for every part that reads one.
#pragma once

#include <filesystem>
#include <string>

namespace kneeprint {

/// The file's bytes. Throws InputError naming it and the system's reason when it cannot be read.
std::string read_text(const std::filesystem::path& file);

}  // namespace kneeprint
