// SPDX-License-Identifier: GPL-3.0-or-later
// model.json: every family fitted, the chosen one, and how it does on what it was not fitted to.
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "sigmoid/fit.h"

namespace kneeprint {

/// One two-tone product at one drive, measured and predicted by one family.
struct HoldoutPoint {
  std::string method, product;
  double drive = 0.0;
  std::optional<double> measured_db, expanded_u_db;  ///< empty measured: flagged, not compared
  double predicted_db = 0.0;
};

struct HoldoutFamily {
  std::string family;
  std::vector<HoldoutPoint> points;
  int compared = 0;
  double rms_error_db = 0.0;  ///< over the compared points, equal weight per point
  double worst_error_db = 0.0;
};

struct Model {
  FitResult fit;
  int polarity = 0;  ///< +1 upright, -1 inverting, 0 not stated
  double fit_frequency_hz = 0.0;
  std::string axis_unit =
      "V";  ///< of x and y: "V", "FS", or "relative" (reel: y over the lowest rung's gain)
  std::string drive_unit = "dBu";
  bool frequency_dependent =
      false;  ///< the plan's frequencies disagree: then no two-tone is a hold-out
  bool frequency_checked = false;  ///< the plan had several frequencies to compare
  std::vector<HoldoutFamily>
      holdout;  ///< one per family, registry order; empty without two-tone takes
};

/// Fields: best.{family,polarity,parameters.{limit,drive,bias,sharpness}.{value,standard_error,
/// interval95,unit}}, families.ID.{parameters,aicc,chi_square,...}, holdout. Sharpness of a family
/// without one has null values.
std::string model_json(const Model& model);
/// Throws InputError naming the file and the field.
Model read_model(const std::filesystem::path& file);

}  // namespace kneeprint
