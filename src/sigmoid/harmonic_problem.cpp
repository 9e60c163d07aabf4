// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/harmonic_problem.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

namespace kneeprint {
namespace {

// Ranges searched, with swing = drive * strongest input. Below, a curve is a straight line to 1e-9
// of H3; above, a square wave. Beyond that bias a sigmoid's tail is a power or an exponential law.
constexpr double kLeastSwing = 1e-4, kMostSwing = 1e3;
constexpr double kMostBias = 6.0;
constexpr double kUnbounded = std::numeric_limits<double>::max();

constexpr std::array kStartBiases{0.0, 0.05, 0.2, 0.5, 1.0, 1.5, 2.5};
constexpr std::array kStartSharpnesses{1.2, 2.0, 3.5, 7.0, 15.0, 35.0};
constexpr double kFirstStartSwing = 1e-3, kLastStartSwing = 100.0, kStartSwingStep = 2.0;
constexpr double kStartAccuracy = 1e-5;
constexpr std::size_t kStartsOfEachSign = 3;

double sigma(const FitDatum& d, double fundamental, double discrepancy) {
  return std::hypot(d.u, discrepancy * fundamental);
}

struct Candidate {
  double sum_of_squares;
  Fitted x;
};

}  // namespace

HarmonicData::HarmonicData(const std::vector<FitDatum>& data) {
  std::vector<FitDatum> sorted = data;
  std::stable_sort(sorted.begin(), sorted.end(), [](const FitDatum& a, const FitDatum& b) {
    return a.input_peak < b.input_peak;
  });
  for (const FitDatum& d : sorted) {
    if (rungs_.empty() || rungs_.back().input_peak != d.input_peak) {
      rungs_.push_back({d.input_peak, 0.0, {}});
    }
    rungs_.back().data.push_back(d);
    orders_ = std::max(orders_, d.order);
    ++size_;
  }
  for (Rung& r : rungs_) {
    double largest = 0.0;
    for (const FitDatum& d : r.data) {
      if (d.order == 1) r.fundamental = std::abs(d.value);
      largest = std::max(largest, std::abs(d.value));
    }
    if (r.fundamental == 0.0) r.fundamental = largest;
  }
}

double HarmonicData::largest_harmonic() const {
  double largest = 0.0;
  for (const Rung& r : rungs_) {
    for (const FitDatum& d : r.data) {
      if (d.order > 1 && r.fundamental > 0.0) {
        largest = std::max(largest, std::abs(d.value) / r.fundamental);
      }
    }
  }
  return largest;
}

double HarmonicData::smallest_u() const {
  double smallest = std::numeric_limits<double>::infinity(), fundamental = 0.0;
  for (const Rung& r : rungs_) {
    fundamental = std::max(fundamental, r.fundamental);
    for (const FitDatum& d : r.data) smallest = std::min(smallest, d.u);
  }
  return fundamental > 0.0 ? smallest / fundamental : 1.0;
}

double HarmonicData::log_variances(double discrepancy) const {
  double sum = 0.0;
  for (const Rung& r : rungs_) {
    for (const FitDatum& d : r.data) sum += 2.0 * std::log(sigma(d, r.fundamental, discrepancy));
  }
  return sum;
}

HarmonicProblem::HarmonicProblem(const HarmonicData& data, const SigmoidFamily& family)
    : data_(data), family_(family), series_(data.orders()) {
  const double input = data.strongest_input();
  low_ = {-kUnbounded, std::log(kLeastSwing / input), -kMostBias};
  high_ = {kUnbounded, std::log(kMostSwing / input), kMostBias};
  if (family.has_sharpness) {
    low_.push_back(std::log(family.sharpness_low));
    high_.push_back(std::log(family.sharpness_high));
  }
}

SigmoidParameters HarmonicProblem::parameters(std::span<const double> x) const {
  SigmoidParameters p{std::exp(x[0]), std::exp(x[1]), x[2], 1.0};
  if (family_.has_sharpness) {
    p.sharpness = std::clamp(std::exp(x[3]), family_.sharpness_low, family_.sharpness_high);
  }
  return p;
}

bool HarmonicProblem::degenerate(std::span<const double> x) const {
  constexpr double kTouching = 1e-6;
  const auto touches = [&](std::size_t j) {
    return x[j] < low_[j] + kTouching || x[j] > high_[j] - kTouching;
  };
  return touches(1) || touches(2);
}

LeastSquaresProblem HarmonicProblem::at(double discrepancy, double accuracy) {
  LeastSquaresProblem problem;
  problem.residuals = data_.size();
  problem.parameters = static_cast<int>(low_.size());
  problem.evaluate = [this, discrepancy, accuracy](std::span<const double> x, std::span<double> r,
                                                   std::span<double> jacobian) {
    return evaluate(discrepancy, accuracy, x, r, jacobian);
  };
  problem.low = low_;
  problem.high = high_;
  return problem;
}

bool HarmonicProblem::evaluate(double discrepancy, double accuracy, std::span<const double> x,
                               std::span<double> r, std::span<double> jacobian) {
  const SigmoidParameters p = parameters(x);
  if (!std::isfinite(p.limit) || !std::isfinite(p.drive)) return false;
  std::size_t row = 0;
  for (const HarmonicData::Rung& rung : data_.rungs()) {
    series_.evaluate(family_, p, rung.input_peak, accuracy, !jacobian.empty(), set_);
    for (const FitDatum& d : rung.data) {
      const auto n = static_cast<std::size_t>(d.order);
      const double h = p.limit * set_.value[n];
      const double sign = d.has_sign || h >= 0.0 ? 1.0 : -1.0;
      const double scale = 1.0 / sigma(d, rung.fundamental, discrepancy);
      const double value = d.has_sign ? d.value : std::abs(d.value);
      r[row] = scale * (sign * h - value);
      if (!jacobian.empty()) {
        double* const j = &jacobian[row * x.size()];
        const double per_unit = scale * sign * p.limit;
        j[0] = scale * sign * h;
        j[1] = per_unit * p.drive * set_.by_drive[n];
        j[2] = per_unit * set_.by_bias[n];
        if (family_.has_sharpness) j[3] = per_unit * p.sharpness * set_.by_sharpness[n];
      }
      ++row;
    }
  }
  return true;
}

std::vector<Fitted> HarmonicProblem::starts(double discrepancy) {
  const auto size = static_cast<std::size_t>(data_.size());
  std::vector<double> h(size);
  std::vector<Candidate> candidates[2];  // of bias >= 0, of bias < 0

  const auto consider = [&](SigmoidParameters p, bool negative) {
    // For an odd S, H_n(-b) = (-1)^(n+1) H_n(b).
    double hh = 0.0, hv = 0.0, vv = 0.0;
    std::size_t row = 0;
    for (const HarmonicData::Rung& rung : data_.rungs()) {
      for (const FitDatum& d : rung.data) {
        const double unit = negative && d.order % 2 == 0 ? -h[row] : h[row];
        const double s = sigma(d, rung.fundamental, discrepancy);
        const double model = (d.has_sign ? unit : std::abs(unit)) / s;
        const double value = (d.has_sign ? d.value : std::abs(d.value)) / s;
        hh += model * model;
        hv += model * value;
        vv += value * value;
        ++row;
      }
    }
    if (hv <= 0.0 || hh <= 0.0) return;
    Fitted x{std::log(hv / hh), std::log(p.drive), negative ? -p.bias : p.bias};
    if (family_.has_sharpness) x.push_back(std::log(p.sharpness));
    candidates[negative].push_back({vv - hv * hv / hh, std::move(x)});
  };

  const auto sharpnesses = family_.has_sharpness ? std::span<const double>(kStartSharpnesses)
                                                 : std::span<const double>(kStartSharpnesses).first(1);
  for (const double sharpness : sharpnesses) {
    for (const double bias : kStartBiases) {
      for (double swing = kFirstStartSwing; swing <= kLastStartSwing; swing *= kStartSwingStep) {
        const SigmoidParameters p{1.0, swing / data_.strongest_input(), bias, sharpness};
        std::size_t row = 0;
        for (const HarmonicData::Rung& rung : data_.rungs()) {
          series_.evaluate(family_, p, rung.input_peak, kStartAccuracy, false, set_);
          for (const FitDatum& d : rung.data) h[row++] = set_.value[static_cast<std::size_t>(d.order)];
        }
        consider(p, false);
        if (bias > 0.0) consider(p, true);
      }
    }
  }

  std::vector<Fitted> chosen;
  for (std::vector<Candidate>& of_sign : candidates) {
    const std::size_t kept = std::min(kStartsOfEachSign, of_sign.size());
    std::partial_sort(of_sign.begin(), of_sign.begin() + static_cast<std::ptrdiff_t>(kept),
                      of_sign.end(), [](const Candidate& a, const Candidate& b) {
                        return a.sum_of_squares < b.sum_of_squares;
                      });
    for (std::size_t i = 0; i < kept; ++i) chosen.push_back(std::move(of_sign[i].x));
  }
  return chosen;
}

}  // namespace kneeprint
