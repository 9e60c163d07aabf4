// SPDX-License-Identifier: GPL-3.0-or-later
#include "cli/result_text.h"

#include <fmt/format.h>

#include <nlohmann/json.hpp>

namespace kneeprint::cli {
namespace {

std::string parameter_text(const char* name, const FittedParameter& p, const std::string& unit) {
  return fmt::format("  {:<10}{:.6g}{}  95 %: {:.6g} to {:.6g}\n", name, p.value,
                     unit.empty() ? "" : " " + unit, p.low95, p.high95);
}

}  // namespace

std::string fit_text(const Model& model) {
  const FittedFamily& best = model.fit.families[model.fit.best];
  std::string text = fmt::format("best family: {} (AICc {:.1f}; if the family holds:)\n",
                                 best.family->id, best.aicc);
  text += parameter_text("limit", best.limit, model.axis_unit);
  text += parameter_text("drive", best.drive, "1/" + model.axis_unit);
  text += parameter_text("bias", best.bias, "");
  if (best.sharpness) text += parameter_text("sharpness", *best.sharpness, "");
  if (!best.describes()) {
    text +=
        "  no family describes this unit: the best one misses more than half of its distortion, so "
        "these "
        "parameters say little about it\n";
  } else if (best.extrapolated) {
    text += fmt::format(
        "  the limit is extrapolated: the output reached {:.0f} % of it; families not rejected put "
        "it "
        "between {:.4g} and {:.4g} {}\n",
        100.0 * best.reach, model.fit.limit_low, model.fit.limit_high, model.axis_unit);
  }
  return text;
}

std::string result_text(const std::filesystem::path& folder, const Published& published,
                        const ClimbEnd& end, bool json) {
  if (json) {
    nlohmann::ordered_json j;
    j["folder"] = folder.string();
    j["takes"] = published.takes;
    j["stop"] = end.stop;
    j["stop_sentence"] = end.sentence;
    j["model"] = published.model ? nlohmann::ordered_json::parse(model_json(*published.model))
                                 : nlohmann::ordered_json(nullptr);
    j["why_no_model"] = published.why_no_model;
    return j.dump(2) + "\n";
  }
  std::string text = fmt::format("{} takes kept in {}\n", published.takes, folder.string());
  if (published.model) text += fit_text(*published.model);
  text += fmt::format("report: {}\n", (folder / "report.html").string());
  return text;
}

}  // namespace kneeprint::cli
