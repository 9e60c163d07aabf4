// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/describe.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "curve/upright.h"
#include "method/method.h"
#include "run/schedule.h"
#include "run/take_reading.h"
#include "sigmoid/predict.h"

namespace kneeprint {
namespace {

constexpr double kAxisDegrees = 20.0;
constexpr double kNothing = 1e-8;  // -160 dB: a symmetric curve predicts no even product at all
constexpr double kClearOfNoise =
    10.0;  // amplitude over component_u: 20 dB, magnitude bias under 0.5 %

bool fits(Flag flag) { return flag == Flag::none || flag == Flag::noise || flag == Flag::floor; }

// The input's peak in volts (full scales) at a drive. On an undeclared reel drives are dBFS too.
double input_peak(const RigView& view, double drive) { return view.send.peak_of_level(drive); }

double relative(Decibels u) { return u.value() * std::log(10.0) / 20.0; }

FitDatum datum_of(const HarmonicPoint& p, double input, double fundamental) {
  const double magnitude = std::hypot(p.in_phase, p.quadrature);
  FitDatum d{input, p.order, p.in_phase, p.component_u, true, 0.0};
  // The rig floor of an order keeps its phase from drive to drive, whatever that is.
  if (p.floor_db) {
    d.common_u = fundamental * std::pow(10.0, *p.floor_db / 20.0) / std::numbers::sqrt2;
  }
  if (magnitude < kClearOfNoise * p.component_u) return d;
  const double off_axis =
      std::atan2(std::abs(p.quadrature), std::abs(p.in_phase)) * 180.0 / std::numbers::pi;
  d.value = off_axis <= kAxisDegrees ? std::copysign(magnitude, p.in_phase) : magnitude;
  d.has_sign = off_axis <= kAxisDegrees;
  return d;
}

bool same_take(const IntermodPoint& a, const IntermodPoint& b) {
  return a.method == b.method && a.drive == b.drive && a.f1_hz == b.f1_hz && a.f2_hz == b.f2_hz &&
         a.ratio == b.ratio;
}

HoldoutFamily hold_out(const FittedFamily& fitted, const Curves& curves, const RigView& view) {
  HoldoutFamily result;
  result.family = fitted.family->id;
  const SigmoidParameters at = fitted.point();
  const auto curve = [&](double x) { return evaluate(*fitted.family, at, x); };
  const TwoToneCurve products = [&](double u1, double u2,
                                    const std::vector<std::pair<int, int>>& wanted) {
    return two_tone_products(curve, u1, u2, wanted);
  };
  double squares = 0.0;
  const IntermodPoint* take = nullptr;  // whose products are predicted
  std::vector<PredictedProduct> predicted;
  for (const IntermodPoint& p : curves.intermods) {
    const Method* method = find_method(p.method);
    if (method == nullptr || method->predict == nullptr) continue;
    if (take == nullptr || !same_take(p, *take)) {
      take = &p;
      StepOptions played;
      played.tones = {Hertz(p.f1_hz), Hertz(p.f2_hz)};
      played.ratio = p.ratio;
      predicted = method->predict(products, played, input_peak(view, p.drive));
    }
    const auto it = std::find_if(predicted.begin(), predicted.end(),
                                 [&](const PredictedProduct& q) { return q.product == p.product; });
    if (it == predicted.end()) continue;
    const double predicted_db = 20.0 * std::log10(std::max(it->ratio, kNothing));
    if (p.flag != Flag::none || !p.db) {
      result.points.push_back({p.method, p.product, p.drive, {}, {}, predicted_db});
      continue;
    }
    result.points.push_back({p.method, p.product, p.drive, p.db, p.expanded_u_db, predicted_db});
    const double error = std::abs(predicted_db - *p.db);
    squares += error * error;
    result.worst_error_db = std::max(result.worst_error_db, error);
    ++result.compared;
  }
  if (result.compared > 0) result.rms_error_db = std::sqrt(squares / result.compared);
  return result;
}

}  // namespace

std::vector<FitDatum> fit_data(const Curves& curves, const Plan& plan, const Rig& rig) {
  const RigView view = view_of(rig);
  const double wanted = fit_frequency(plan);
  std::vector<FitDatum> data;
  double fundamental = 0.0;  // orders follow their fundamental in the table
  for (const HarmonicPoint& p : curves.harmonics) {
    // Played frequencies are within 0.1 % of those asked for.
    if (std::abs(p.frequency_hz - wanted) > 0.0011 * wanted) continue;
    if (p.order == 1) fundamental = std::hypot(p.in_phase, p.quadrature);
    if (!fits(p.flag) || !p.level || p.component_u <= 0.0) continue;
    data.push_back(datum_of(p, input_peak(view, p.drive), fundamental));
  }
  return data;
}

Model describe(const Curves& curves, const Plan& plan, const Rig& rig) {
  const RigView view = view_of(rig);
  FitOptions options;
  options.send_relative_u = relative(view.send.standard_uncertainty);
  options.return_relative_u = relative(view.ret.standard_uncertainty);
  Model model;
  model.fit = fit_sigmoids(fit_data(curves, plan, rig), options);
  model.polarity = polarity_of(curves, plan);
  model.fit_frequency_hz = fit_frequency(plan);
  model.drive_unit = name(view.send.unit);
  model.axis_unit = !view.gain_known ? "relative" : view.send.is_calibrated() ? "V" : "FS";
  const std::optional<bool> dependent = depends_on_frequency(curves);
  model.frequency_checked = dependent.has_value();
  model.frequency_dependent = dependent.value_or(false);
  if (!curves.intermods.empty()) {
    for (const FittedFamily& f : model.fit.families) {
      model.holdout.push_back(hold_out(f, curves, view));
    }
  }
  return model;
}

}  // namespace kneeprint
