// SPDX-License-Identifier: GPL-3.0-or-later
// The tables as CSV files: comma, dot decimal, one header row, shortest digits that read back to
// the same double (so equal tables are equal bytes).
#pragma once

#include <filesystem>
#include <span>
#include <string>
#include <string_view>

#include "curve/points.h"

namespace kneeprint {

struct CsvTable {
  std::string_view file;  ///< name within curves/
  std::string (*text)(const Curves&);
};

/// Every table: levels, harmonics, intermod, response, products, glide, scalars, traces.
std::span<const CsvTable> csv_tables();

/// levels.csv, harmonics.csv, intermod.csv, response.csv as text.
std::string levels_csv(const Curves& c);
std::string harmonics_csv(const Curves& c);
std::string intermod_csv(const Curves& c);
std::string response_csv(const Curves& c);

/// Reads the files of a curves/ folder. Throws InputError naming file, row and column.
Curves read_curves(const std::filesystem::path& folder);

}  // namespace kneeprint
