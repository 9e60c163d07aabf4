// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/harmonic_problem.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <map>
#include <numeric>
#include <utility>

namespace kneeprint {
namespace {

// Ranges searched, with swing = drive * strongest input. Below, H3 is under 1e-7 of H1 and any
// sigmoid is a straight line; above, a square wave.
constexpr double kLeastSwing = 1e-3, kMostSwing = 1e3;
constexpr double kMostBias = 6.0;
// Rest stays where the sigmoid has a thousandth of its steepest slope: further out the output is a
// difference of nearly equal numbers, and its rounding errors would be fitted.
constexpr double kLeastSlope = 1e-3;

constexpr std::array kStartBiases{0.0, 0.05, 0.2, 0.5, 1.0, 1.5, 2.5};
constexpr std::array kStartSharpnesses{1.2, 2.0, 3.5, 7.0, 15.0, 35.0};
constexpr double kFirstStartSwing = 2e-3, kLastStartSwing = 100.0, kStartSwingStep = 2.0;
constexpr std::size_t kMostStarts = 6;

constexpr double kFinestAccuracy = 1e-12, kCoarsestAccuracy = 1e-6;  // of the quadrature
constexpr double kGridAccuracy = 1e-5;

double dot(const std::vector<double>& a, const std::vector<double>& b) {
  return std::inner_product(a.begin(), a.end(), b.begin(), 0.0);
}

}  // namespace

double HarmonicData::Rung::sigma(const FitDatum& d, double discrepancy) const {
  return std::hypot(d.u, discrepancy * distortion);
}

HarmonicData::HarmonicData(const std::vector<FitDatum>& data) {
  std::vector<FitDatum> sorted = data;
  std::stable_sort(sorted.begin(), sorted.end(), [](const FitDatum& a, const FitDatum& b) {
    return a.input_peak < b.input_peak;
  });
  for (const FitDatum& d : sorted) {
    if (rungs_.empty() || rungs_.back().input_peak != d.input_peak) {
      rungs_.push_back({d.input_peak, 0.0, 0.0, {}});
    }
    rungs_.back().data.push_back(d);
    orders_ = std::max(orders_, d.order);
    ++size_;
  }
  for (Rung& r : rungs_) {
    double largest = 0.0;
    for (const FitDatum& d : r.data) {
      if (d.order == 1) r.fundamental = std::abs(d.value);
      if (d.order > 1) r.distortion = std::hypot(r.distortion, d.value);
      largest = std::max(largest, std::abs(d.value));
    }
    if (r.fundamental == 0.0) r.fundamental = largest;
    if (r.distortion == 0.0) r.distortion = r.fundamental;
  }
}

double HarmonicData::largest_distortion() const {
  double largest = 0.0, fundamental = 0.0;
  for (const Rung& r : rungs_) {
    largest = std::max(largest, r.distortion);
    fundamental = std::max(fundamental, r.fundamental);
  }
  return fundamental > 0.0 ? largest / fundamental : 1.0;
}

double HarmonicData::smallest_sigma(double discrepancy) const {
  double smallest = std::numeric_limits<double>::infinity(), fundamental = 0.0;
  for (const Rung& r : rungs_) {
    fundamental = std::max(fundamental, r.fundamental);
    for (const FitDatum& d : r.data) {
      smallest = std::min(smallest, r.sigma(d, discrepancy));
    }
  }
  return fundamental > 0.0 ? smallest / fundamental : 1.0;
}

double HarmonicData::log_variances(double discrepancy) const {
  double sum = 0.0;
  for (const Rung& r : rungs_) {
    for (const FitDatum& d : r.data) sum += 2.0 * std::log(r.sigma(d, discrepancy));
  }
  return sum;
}

HarmonicProblem::HarmonicProblem(const HarmonicData& data, const SigmoidFamily& family)
    : data_(data), family_(family), series_(data.orders()) {
  const double input = data.strongest_input();
  low_ = {std::log(kLeastSwing / input), -kMostBias};
  high_ = {std::log(kMostSwing / input), kMostBias};
  if (family.has_sharpness) {
    low_.push_back(std::log(family.sharpness_low));
    high_.push_back(std::log(family.sharpness_high));
  }
}

SigmoidParameters HarmonicProblem::unit_limit(std::span<const double> shape) const {
  SigmoidParameters p{1.0, std::exp(shape[0]), shape[1], 1.0};
  if (family_.has_sharpness) {
    p.sharpness = std::clamp(std::exp(shape[2]), family_.sharpness_low, family_.sharpness_high);
  }
  return p;
}

double HarmonicProblem::slope_at_rest(std::span<const double> shape) const {
  const SigmoidParameters p = unit_limit(shape);
  return family_.slope(p.bias, p.sharpness);
}

bool HarmonicProblem::degenerate(const Shape& shape) const {
  constexpr double kTouching = 1e-6;
  const auto touches = [&](std::size_t j) {
    return shape[j] < low_[j] + kTouching || shape[j] > high_[j] - kTouching;
  };
  return touches(0) || touches(1) || slope_at_rest(shape) < 1.01 * kLeastSlope;
}

std::vector<double> HarmonicProblem::scaled_values(double discrepancy) const {
  std::vector<double> values;
  for (const HarmonicData::Rung& rung : data_.rungs()) {
    for (const FitDatum& d : rung.data) {
      values.push_back((d.has_sign ? d.value : std::abs(d.value)) / rung.sigma(d, discrepancy));
    }
  }
  return values;
}

void HarmonicProblem::scaled_model(double discrepancy, std::span<const double> shape,
                                   std::span<double> model, std::span<double> jacobian) {
  const double accuracy =
      std::clamp(1e-3 * data_.smallest_sigma(discrepancy), kFinestAccuracy, kCoarsestAccuracy);
  const SigmoidParameters p = unit_limit(shape);
  std::size_t row = 0;
  for (const HarmonicData::Rung& rung : data_.rungs()) {
    series_.evaluate(family_, p, rung.input_peak, accuracy, !jacobian.empty(), set_);
    for (const FitDatum& d : rung.data) {
      const auto n = static_cast<std::size_t>(d.order);
      const double sign = d.has_sign || set_.value[n] >= 0.0 ? 1.0 : -1.0;
      const double scale = sign / rung.sigma(d, discrepancy);
      model[row] = scale * set_.value[n];
      if (!jacobian.empty()) {
        double* const j = &jacobian[row * shape.size()];
        j[0] = scale * p.drive * set_.by_drive[n];
        j[1] = scale * set_.by_bias[n];
        if (family_.has_sharpness) j[2] = scale * p.sharpness * set_.by_sharpness[n];
      }
      ++row;
    }
  }
}

LeastSquaresProblem HarmonicProblem::over_shapes(double discrepancy) {
  LeastSquaresProblem problem;
  problem.residuals = data_.size();
  problem.parameters = static_cast<int>(low_.size());
  problem.low = low_;
  problem.high = high_;
  problem.evaluate = [this, discrepancy, values = scaled_values(discrepancy)](
                         std::span<const double> shape, std::span<double> r,
                         std::span<double> jacobian) {
    if (slope_at_rest(shape) < kLeastSlope) return false;
    std::vector<double> h(values.size());
    scaled_model(discrepancy, shape, h, jacobian);
    const double hh = dot(h, h), hv = dot(h, values);
    if (!(hv > 0.0)) return false;  // no positive limit fits
    const double limit = hv / hh;
    for (std::size_t i = 0; i < h.size(); ++i) r[i] = limit * h[i] - values[i];
    if (jacobian.empty()) return true;
    const std::size_t width = shape.size();
    for (std::size_t j = 0; j < width; ++j) {
      double along = 0.0;  // what the limit makes up for
      for (std::size_t i = 0; i < h.size(); ++i) along += h[i] * jacobian[i * width + j];
      for (std::size_t i = 0; i < h.size(); ++i) {
        jacobian[i * width + j] = limit * (jacobian[i * width + j] - h[i] * along / hh);
      }
    }
    return true;
  };
  return problem;
}

LeastSquaresProblem HarmonicProblem::over_all(double discrepancy) {
  LeastSquaresProblem problem;
  problem.residuals = data_.size();
  problem.parameters = static_cast<int>(low_.size()) + 1;
  problem.evaluate = [this, discrepancy, values = scaled_values(discrepancy)](
                         std::span<const double> x, std::span<double> r,
                         std::span<double> jacobian) {
    const double limit = std::exp(x[0]);
    const std::size_t width = x.size() - 1;
    std::vector<double> by_shape(jacobian.empty() ? 0 : values.size() * width);
    scaled_model(discrepancy, x.subspan(1), r, by_shape);
    for (std::size_t i = 0; i < values.size(); ++i) {
      const double modelled = limit * r[i];
      r[i] = modelled - values[i];
      if (jacobian.empty()) continue;
      jacobian[i * x.size()] = modelled;
      for (std::size_t j = 0; j < width; ++j) {
        jacobian[i * x.size() + 1 + j] = limit * by_shape[i * width + j];
      }
    }
    return true;
  };
  return problem;
}

SigmoidParameters HarmonicProblem::parameters(const Shape& shape, double discrepancy) {
  const std::vector<double> values = scaled_values(discrepancy);
  std::vector<double> h(values.size());
  scaled_model(discrepancy, shape, h, {});
  SigmoidParameters p = unit_limit(shape);
  p.limit = dot(h, values) / dot(h, h);
  return p;
}

const std::vector<HarmonicProblem::GridPoint>& HarmonicProblem::grid() {
  if (!grid_.empty()) return grid_;
  const std::span<const double> sharpnesses(kStartSharpnesses);
  for (const double sharpness : sharpnesses.first(family_.has_sharpness ? sharpnesses.size() : 1)) {
    for (const double bias : kStartBiases) {
      for (double swing = kFirstStartSwing; swing <= kLastStartSwing; swing *= kStartSwingStep) {
        GridPoint point{{std::log(swing / data_.strongest_input()), bias}, {}};
        if (family_.has_sharpness) point.shape.push_back(std::log(sharpness));
        if (slope_at_rest(point.shape) < kLeastSlope) continue;
        const SigmoidParameters p = unit_limit(point.shape);
        for (const HarmonicData::Rung& rung : data_.rungs()) {
          series_.evaluate(family_, p, rung.input_peak, kGridAccuracy, false, set_);
          for (const FitDatum& d : rung.data) {
            point.harmonics.push_back(set_.value[static_cast<std::size_t>(d.order)]);
          }
        }
        grid_.push_back(std::move(point));
      }
    }
  }
  return grid_;
}

std::optional<HarmonicProblem::Candidate> HarmonicProblem::candidate(const GridPoint& point,
                                                                     bool negative,
                                                                     double discrepancy) const {
  double hh = 0.0, hv = 0.0, vv = 0.0;
  std::size_t row = 0;
  for (const HarmonicData::Rung& rung : data_.rungs()) {
    for (const FitDatum& d : rung.data) {
      // For an odd S, H_n(-b) = (-1)^(n+1) H_n(b).
      const double h = negative && d.order % 2 == 0 ? -point.harmonics[row] : point.harmonics[row];
      const double s = rung.sigma(d, discrepancy);
      const double model = (d.has_sign ? h : std::abs(h)) / s;
      const double value = (d.has_sign ? d.value : std::abs(d.value)) / s;
      hh += model * model;
      hv += model * value;
      vv += value * value;
      ++row;
    }
  }
  if (!(hv > 0.0)) return std::nullopt;  // no positive limit fits
  Candidate c{vv - hv * hv / hh, point.shape};
  if (negative) c.shape[1] = -c.shape[1];
  return c;
}

std::vector<Shape> HarmonicProblem::starts(double discrepancy) {
  std::map<std::pair<double, double>, Candidate> best;  // by sharpness and sign, or by bias
  for (const GridPoint& point : grid()) {
    for (const bool negative : {false, true}) {
      if (negative && point.shape[1] == 0.0) continue;
      std::optional<Candidate> c = candidate(point, negative, discrepancy);
      if (!c) continue;
      const std::pair<double, double> line = family_.has_sharpness
                                                 ? std::pair(c->shape[2], negative ? -1.0 : 1.0)
                                                 : std::pair(0.0, c->shape[1]);
      const auto [at, first] = best.try_emplace(line, *c);
      if (!first && c->sum_of_squares < at->second.sum_of_squares) at->second = std::move(*c);
    }
  }
  std::vector<Candidate> sorted;
  for (auto& [line, c] : best) sorted.push_back(std::move(c));
  std::stable_sort(sorted.begin(), sorted.end(), [](const Candidate& l, const Candidate& r) {
    return l.sum_of_squares < r.sum_of_squares;
  });
  std::vector<Shape> chosen;
  for (std::size_t i = 0; i < std::min(kMostStarts, sorted.size()); ++i) {
    chosen.push_back(std::move(sorted[i].shape));
  }
  return chosen;
}

}  // namespace kneeprint
