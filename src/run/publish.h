// SPDX-License-Identifier: GPL-3.0-or-later
// The steps after the takes, each from the files of the folder alone, so that any of them can be
// repeated later.
#pragma once

#include <filesystem>

#include "run/progress.h"
#include "sigmoid/model.h"

namespace kneeprint {

struct Published {
  int takes = 0;               ///< kept, without the chain check
  std::optional<Model> model;  ///< empty when nothing could be fitted
  std::string why_no_model;
};

/// takes -> curves/*.csv. Returns the number of takes read.
int analyse_folder(const std::filesystem::path& folder);
/// curves -> model.json. Throws NothingUsable when there is too little to fit.
Model fit_folder(const std::filesystem::path& folder);
/// curves and model.json -> report.html, report.pdf. Without a model.json the page says why.
void report_folder(const std::filesystem::path& folder, const std::string& why_no_model = {});
/// All three, one after the other; a fit that is not possible does not stop the report.
Published publish_folder(const std::filesystem::path& folder, Progress& progress);

}  // namespace kneeprint
