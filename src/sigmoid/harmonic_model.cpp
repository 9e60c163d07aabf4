// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/harmonic_model.h"

#include <algorithm>
#include <cmath>
#include <map>
#include <numbers>

namespace kneeprint {

HarmonicModel::HarmonicModel(const std::vector<FitDatum>& data, int points)
    : data_(data), points_(points) {
  std::map<double, std::vector<std::size_t>> by_amplitude;
  int highest = 0;
  for (std::size_t i = 0; i < data.size(); ++i) {
    by_amplitude[data[i].input_peak].push_back(i);
    highest = std::max(highest, data[i].order);
  }
  for (auto& [amplitude, indices] : by_amplitude) groups_.push_back({amplitude, indices});
  for (int n = 0; n <= highest; ++n) {
    const double weight = (n == 0 ? 1.0 : 2.0) / points;
    std::vector<double> c;
    for (int k = 0; k < points; ++k) {
      c.push_back(weight * std::cos(n * std::numbers::pi * (k + 0.5) / points));
    }
    cosines_.push_back(std::move(c));
  }
  for (int k = 0; k < points; ++k)
    nodes_.push_back(std::cos(std::numbers::pi * (k + 0.5) / points));
}

std::vector<ModelledHarmonic> HarmonicModel::evaluate(const SigmoidFamily& family,
                                                      const SigmoidParameters& p) const {
  std::vector<ModelledHarmonic> out(data_.size());
  const auto count = static_cast<std::size_t>(points_);
  std::vector<double> y(count), by_drive(count), by_bias(count), by_sharpness(count);
  // y = L (S(d x + b) - S(b)), so that dy/dL = y / L and the rest by the chain rule.
  const double at_rest = family.value(p.bias, p.sharpness);
  const double slope_at_rest = family.slope(p.bias, p.sharpness);
  const double sharpness_at_rest = family.by_sharpness(p.bias, p.sharpness);
  for (const Group& g : groups_) {
    for (std::size_t k = 0; k < count; ++k) {
      const double x = g.amplitude * nodes_[k];
      const double z = p.drive * x + p.bias;
      const double slope = family.slope(z, p.sharpness);
      y[k] = p.limit * (family.value(z, p.sharpness) - at_rest);
      by_drive[k] = p.limit * x * slope;
      by_bias[k] = p.limit * (slope - slope_at_rest);
      if (family.has_sharpness) {
        by_sharpness[k] = p.limit * (family.by_sharpness(z, p.sharpness) - sharpness_at_rest);
      }
    }
    for (const std::size_t i : g.data) {
      const std::vector<double>& c = cosines_[static_cast<std::size_t>(data_[i].order)];
      ModelledHarmonic& h = out[i];
      for (std::size_t k = 0; k < count; ++k) {
        h.value += c[k] * y[k];
        h.by_drive += c[k] * by_drive[k];
        h.by_bias += c[k] * by_bias[k];
        if (family.has_sharpness) h.by_sharpness += c[k] * by_sharpness[k];
      }
      h.by_limit = h.value / p.limit;
    }
  }
  return out;
}

}  // namespace kneeprint
