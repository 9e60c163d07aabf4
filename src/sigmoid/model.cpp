// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/model.h"

#include <algorithm>
#include <nlohmann/json.hpp>

#include "platform/json_fields.h"
#include "platform/read_text.h"

namespace kneeprint {
namespace {

using Json = nlohmann::ordered_json;

constexpr const char* kFormat = "kneeprint-model";
constexpr int kVersion = 1;

// A parameter that the family does not have keeps its place, with nulls.
Json parameter_json(const FittedParameter* p, const std::string& unit) {
  Json j;
  j["value"] = p ? Json(p->value) : Json(nullptr);
  j["standard_error"] = p ? Json(p->standard_error) : Json(nullptr);
  j["interval95"] = p ? Json::array({p->low95, p->high95}) : Json::array({nullptr, nullptr});
  j["unit"] = unit;
  return j;
}

Json parameters_json(const FittedFamily& f, const std::string& axis_unit) {
  Json j;
  j["limit"] = parameter_json(&f.limit, axis_unit);
  j["drive"] = parameter_json(&f.drive, "1/" + axis_unit);
  j["bias"] = parameter_json(&f.bias, "");
  j["sharpness"] = parameter_json(f.sharpness ? &*f.sharpness : nullptr, "");
  return j;
}

Json family_json(const FittedFamily& f, const std::string& axis_unit) {
  Json j;
  j["parameters"] = parameters_json(f, axis_unit);
  j["aicc"] = f.aicc;
  j["chi_square"] = f.chi_square;
  j["data"] = f.data;
  j["fitted_parameters"] = f.parameters;
  j["discrepancy"] = f.discrepancy;
  j["reach"] = f.reach;
  j["extrapolated"] = f.extrapolated;
  j["converged"] = f.converged;
  return j;
}

Json cell(const std::optional<double>& value) { return value ? Json(*value) : Json(nullptr); }

Json holdout_json(const HoldoutFamily& h) {
  Json j;
  j["compared"] = h.compared;
  j["rms_error_db"] = h.rms_error_db;
  j["worst_error_db"] = h.worst_error_db;
  j["points"] = Json::array();
  for (const HoldoutPoint& p : h.points) {
    j["points"].push_back({{"method", p.method},
                           {"product", p.product},
                           {"drive", p.drive},
                           {"measured_db", cell(p.measured_db)},
                           {"expanded_u_db", cell(p.expanded_u_db)},
                           {"predicted_db", p.predicted_db}});
  }
  return j;
}

FittedParameter read_parameter(const JsonFields& f) {
  const std::vector<double> interval = f.numbers("interval95", {-1e300, 1e300});
  if (interval.size() != 2) f.refuse("interval95", "expected two numbers");
  return {f.number("value"), f.number("standard_error"), interval[0], interval[1]};
}

FittedFamily read_family(const JsonFields& f, const SigmoidFamily& family) {
  FittedFamily out;
  out.family = &family;
  const JsonFields p = f.object("parameters");
  out.limit = read_parameter(p.object("limit"));
  out.drive = read_parameter(p.object("drive"));
  out.bias = read_parameter(p.object("bias"));
  if (family.has_sharpness) out.sharpness = read_parameter(p.object("sharpness"));
  out.aicc = f.number("aicc");
  out.chi_square = f.number("chi_square");
  out.data = f.integer("data", 0, 1000000);
  out.parameters = f.integer("fitted_parameters", 0, 1000);
  out.discrepancy = f.number("discrepancy");
  out.reach = f.number("reach");
  out.extrapolated = f.boolean("extrapolated");
  out.converged = f.boolean("converged");
  return out;
}

HoldoutFamily read_holdout(const JsonFields& f, const std::string& family) {
  HoldoutFamily out;
  out.family = family;
  out.compared = f.integer("compared", 0, 1000000);
  out.rms_error_db = f.number("rms_error_db");
  out.worst_error_db = f.number("worst_error_db");
  for (const JsonFields& p : f.objects("points")) {
    HoldoutPoint point{p.text("method"), p.text("product"), p.number("drive"), {}, {}, 0.0};
    if (!p.is_null("measured_db")) point.measured_db = p.number("measured_db");
    if (!p.is_null("expanded_u_db")) point.expanded_u_db = p.number("expanded_u_db");
    point.predicted_db = p.number("predicted_db");
    out.points.push_back(point);
  }
  return out;
}

std::size_t index_of(const std::vector<FittedFamily>& families, const std::string& id,
                     const JsonFields& f, const std::string& field) {
  for (std::size_t i = 0; i < families.size(); ++i) {
    if (families[i].family->id == id) return i;
  }
  f.refuse(field, "names \"" + id + "\", which is not among the fitted families");
}

}  // namespace

std::string model_json(const Model& model) {
  const FitResult& fit = model.fit;
  const FittedFamily& best = fit.families[fit.best];
  Json j;
  j["format"] = kFormat;
  j["version"] = kVersion;
  j["fit_frequency_hz"] = model.fit_frequency_hz;
  j["axis_unit"] = model.axis_unit;
  j["drive_unit"] = model.drive_unit;
  j["frequency_dependent"] = model.frequency_dependent;
  j["frequency_checked"] = model.frequency_checked;
  j["best"]["family"] = std::string(best.family->id);
  j["best"]["polarity"] = model.polarity;
  j["best"]["parameters"] = parameters_json(best, model.axis_unit);
  j["best"]["extrapolated"] = best.extrapolated;
  j["best"]["describes_unit"] = best.describes();
  j["equally_good"] = Json::array();
  for (const std::size_t i : fit.equally_good) {
    j["equally_good"].push_back(std::string(fit.families[i].family->id));
  }
  j["limit_over_families"] = {fit.limit_low, fit.limit_high};
  j["families"] = Json::object();
  for (const FittedFamily& f : fit.families) {
    j["families"][std::string(f.family->id)] = family_json(f, model.axis_unit);
  }
  j["holdout"] = Json::object();
  for (const HoldoutFamily& h : model.holdout) j["holdout"][h.family] = holdout_json(h);
  return j.dump(2) + "\n";
}

Model read_model(const std::filesystem::path& file) {
  const nlohmann::json value = parse_json(read_text(file), file.string());
  const JsonFields f(value, file.string());
  f.check_format(kFormat, kVersion);
  Model model;
  model.fit_frequency_hz = f.number("fit_frequency_hz");
  model.axis_unit = f.text("axis_unit");
  model.drive_unit = f.text("drive_unit");
  model.frequency_dependent = f.boolean("frequency_dependent");
  model.frequency_checked = f.boolean("frequency_checked");
  const JsonFields families = f.object("families");
  const JsonFields holdout = f.object("holdout");
  std::vector<std::string> known;
  for (const SigmoidFamily& family : sigmoid_families()) known.emplace_back(family.id);
  families.allow_only(known);
  holdout.allow_only(known);
  // Registry order, whatever order the file has.
  for (const SigmoidFamily& family : sigmoid_families()) {
    const std::string id(family.id);
    if (families.has(id)) {
      model.fit.families.push_back(read_family(families.object(id), family));
    }
    if (holdout.has(id)) model.holdout.push_back(read_holdout(holdout.object(id), id));
  }
  const JsonFields best = f.object("best");
  model.polarity = best.integer("polarity", -1, 1);
  model.fit.best = index_of(model.fit.families, best.text("family"), best, "family");
  for (const std::string& id : f.texts("equally_good")) {
    model.fit.equally_good.push_back(index_of(model.fit.families, id, f, "equally_good"));
  }
  const std::vector<double> limits = f.numbers("limit_over_families", {-1e300, 1e300});
  if (limits.size() != 2) f.refuse("limit_over_families", "expected two numbers");
  model.fit.limit_low = limits[0];
  model.fit.limit_high = limits[1];
  return model;
}

}  // namespace kneeprint
