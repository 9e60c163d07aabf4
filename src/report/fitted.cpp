// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "report/number_text.h"
#include "report/report_facts.h"
#include "report/report_sections.h"

namespace kneeprint {
namespace {

struct AxisUnits {
  std::string input, output, inverse;
};

AxisUnits axis_units(const Model& model) {
  if (model.axis_unit == "V") return {"V", "V", "1/V"};
  if (model.axis_unit == "relative") return {"full scales", "relative", "1/full scale"};
  return {"full scales", "full scales", "1/full scale"};
}

Table parameter_table(const Model& model, const FittedFamily& best) {
  const AxisUnits unit = axis_units(model);
  const SigmoidParameters p = best.point();
  const double slope = p.limit * p.drive * best.family->slope(p.bias, p.sharpness);
  Table t;
  t.caption = fmt::format("{}, S(z) = {}. Value and 95 % interval, if the family holds.",
                          best.family->title, best.family->formula);
  t.heads = {"parameter", "value (95 % interval)", "unit", "what it is"};
  t.all_text = true;
  t.rows.push_back({"limit", with_interval(best.limit), unit.output,
                    best.extrapolated ? "half the swing between the two limits; extrapolated"
                                      : "half the swing between the two limits"});
  t.rows.push_back(
      {"drive", with_interval(best.drive), unit.inverse, "how hard the input pushes the sigmoid"});
  t.rows.push_back(
      {"bias", with_interval(best.bias), "1", "where rest sits on the sigmoid; 0 is its centre"});
  if (best.sharpness)
    t.rows.push_back(
        {"sharpness", with_interval(*best.sharpness), "1", "p: the larger, the harder the knee"});
  t.rows.push_back(
      {"gain at rest", short_text(slope), unit.output + "/" + unit.input,
       fmt::format("limit · drive · S'(bias): {} dB", fixed_text(20.0 * std::log10(slope), 2))});
  if (p.drive != 0.0)
    t.rows.push_back(
        {"centre of symmetry", short_text(-p.bias / p.drive, 3), unit.input,
         fmt::format("the input {}bias/drive at which the curve is symmetric", kMinus)});
  return t;
}

bool equally_good(const FitResult& fit, std::size_t index) {
  return std::find(fit.equally_good.begin(), fit.equally_good.end(), index) !=
         fit.equally_good.end();
}

const HoldoutFamily* holdout_of(const Model& model, const FittedFamily& family) {
  for (const auto& h : model.holdout)
    if (h.family == family.family->id) return &h;
  return nullptr;
}

std::string verdict(const FitResult& fit, std::size_t i) {
  if (!fit.families[i].converged) return "not converged";
  if (i == fit.best)
    return fit.equally_good.size() > 1 ? "chosen; not the only good one" : "chosen";
  return equally_good(fit, i) ? "equally good" : "";
}

Table family_table(const Model& model) {
  const FitResult& fit = model.fit;
  Table t;
  t.caption =
      "Every family, fitted to the same harmonics. Lower AICc is better; within 2 of the best the "
      "data do not decide. Discrepancy: what the family cannot reach, as a share of each drive's "
      "distortion. "
      "Chi-square counts measurement uncertainty alone.";
  t.heads = {"family",
             "AICc",
             "above the best",
             "chi-square / data",
             "discrepancy",
             "limit, " + axis_units(model).output,
             "two-tone rms error",
             "verdict"};
  for (std::size_t i = 0; i < fit.families.size(); ++i) {
    const auto& f = fit.families[i];
    const auto* h = holdout_of(model, f);
    t.rows.push_back(
        {std::string(f.family->title), fixed_text(f.aicc, 1),
         fixed_text(f.aicc - fit.families[fit.best].aicc, 1),
         fmt::format("{} / {}", short_text(f.chi_square, 3), f.data),
         f.discrepancy > 0.0 ? short_text(100.0 * f.discrepancy, 2) + " %" : "none",
         fixed_text(f.limit.value, decimals_for(0.5 * (f.limit.high95 - f.limit.low95))),
         h && h->compared > 0 ? fixed_text(h->rms_error_db, 2) + " dB" : kDash, verdict(fit, i)});
  }
  return t;
}

using Product = std::pair<std::string, std::string>;  ///< method, product

std::string product_text(const Product& p) { return p.second + ", " + p.first; }

/// In order of appearance.
std::vector<Product> products_of(const HoldoutFamily& h) {
  std::vector<Product> found;
  for (const auto& p : h.points)
    if (std::find(found.begin(), found.end(), Product{p.method, p.product}) == found.end())
      found.emplace_back(p.method, p.product);
  return found;
}

/// By product: how far the prediction is off, and how often by more than the measurement's doubt.
Table product_table(const HoldoutFamily& h, const Model& model) {
  Table t;
  t.caption = fmt::format(
      "Predicted less measured, by product; drive in {}. The last column counts the points whose "
      "95 % interval does not hold the prediction (1 in 20 is to be expected of a true curve).",
      model.drive_unit);
  t.heads = {"product", "points compared", "rms error, dB", "worst, dB", "at drive", "outside"};
  for (const auto& product : products_of(h)) {
    int compared = 0, outside = 0;
    double sum = 0.0, worst = 0.0, at = 0.0;
    for (const auto& p : h.points) {
      if (!p.measured_db || Product{p.method, p.product} != product) continue;
      const double error = p.predicted_db - *p.measured_db;
      ++compared;
      outside += p.expanded_u_db && std::abs(error) > *p.expanded_u_db;
      sum += error * error;
      if (std::abs(error) >= std::abs(worst)) {
        worst = error;
        at = p.drive;
      }
    }
    if (compared == 0) {
      t.rows.push_back({product_text(product), "none", kDash, kDash, kDash, kDash});
      continue;
    }
    t.rows.push_back({product_text(product), std::to_string(compared),
                      fixed_text(std::sqrt(sum / compared), 2), fixed_text(worst, 2),
                      fixed_text(at, 2), std::to_string(outside)});
  }
  return t;
}

}  // namespace

Section model_section(const ReportData& data) {
  Section s{"The fitted curve", {}};
  const FittedFamily* best = best_family(data);
  if (!best) {
    s.blocks.push_back(Paragraph{data.why_no_model.empty()
                                     ? "No curve was fitted."
                                     : "No curve was fitted: " + data.why_no_model});
    return s;
  }
  const Model& model = *data.model;
  const AxisUnits unit = axis_units(model);
  s.blocks.push_back(Paragraph{
      fmt::format("y = limit · (S(drive · x + bias) {0} S(bias)), with x the input in {1}, y the "
                  "output in {2} and S the family's sigmoid, which has slope 1 at its centre and "
                  "ends at {0}1 and +1. Fitted to the harmonics of all rungs at {3} Hz. {4}",
                  kMinus, unit.input, unit.output, short_text(model.fit_frequency_hz, 6),
                  model.polarity > 0   ? "The unit does not invert."
                  : model.polarity < 0 ? "The unit inverts; the curve is given upright."
                                       : "Its polarity could not be stated.")});
  s.blocks.push_back(parameter_table(model, *best));
  s.blocks.push_back(family_table(model));
  return s;
}

Section holdout_section(const ReportData& data) {
  if (!data.model || data.model->holdout.empty()) return {};
  const Model& model = *data.model;
  const HoldoutFamily* h = best_holdout(data);
  if (!h || h->points.empty()) return {};
  Section s{model.frequency_dependent ? "Two-tone prediction" : "Hold-out: two tones", {}};
  std::string text;
  if (model.frequency_dependent)
    text =
        "The unit depends on frequency, so this comparison tests the frequencies as much as the "
        "curve. ";
  else if (model.frequency_checked)
    text = "The two-tone takes had no part in the fit: the curve is judged on them. ";
  else
    text =
        "The two-tone takes had no part in the fit. The plan had one usable frequency only, so it "
        "is not known whether the unit depends on frequency; an error here may come from that. ";
  if (h->compared > 0)
    text += fmt::format("Over {} point{} the {} curve is off by {} dB rms, at worst {} dB.",
                        h->compared, h->compared == 1 ? "" : "s", h->family,
                        fixed_text(h->rms_error_db, 2), fixed_text(h->worst_error_db, 2));
  else
    text += "Nothing could be compared: all products are flagged.";
  s.blocks.push_back(Paragraph{text});

  s.blocks.push_back(product_table(*h, model));
  return s;
}

Section holdout_points_section(const ReportData& data) {
  const HoldoutFamily* h = best_holdout(data);
  if (!h) return {};
  Section s{"Every two-tone product against its prediction", {}};
  s.collapsed = s.on_screen_only = true;
  Table t;
  t.caption = fmt::format(
      "Measured (± at 95 %) against what the {} curve predicts, dB; drive in {}. Flagged products "
      "are left out.",
      h->family, data.model->drive_unit);
  t.heads = {"product", "drive", "measured", "predicted", "predicted less measured"};
  for (const auto& product : products_of(*h))
    for (const auto& p : h->points) {
      if (!p.measured_db || Product{p.method, p.product} != product) continue;
      const int d = p.expanded_u_db ? std::min(2, decimals_for(*p.expanded_u_db)) : 2;
      t.rows.push_back({product_text(product), fixed_text(p.drive, 2),
                        with_u(p.measured_db, p.expanded_u_db), fixed_text(p.predicted_db, 2),
                        fixed_text(p.predicted_db - *p.measured_db, d)});
    }
  if (!t.rows.empty()) s.blocks.push_back(t);
  return s;
}

}  // namespace kneeprint
