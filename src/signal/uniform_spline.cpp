// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/uniform_spline.h"

#include <Eigen/SparseCholesky>
#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace kneeprint {
namespace {

constexpr std::size_t kWidth = UniformSpline::kWidth, kDegree = kWidth - 1;

// B-splines of `degree` on whole knots, those that are not 0 from 0 to 1, at t (de Boor 1978,
// ch. X, eq. 5).
std::array<double, kWidth> splines(std::size_t degree, double t) {
  std::array<double, kWidth> w{1.0};
  for (std::size_t d = 1; d <= degree; ++d) {
    const auto n = static_cast<double>(d);
    for (std::size_t j = d + 1; j-- > 0;) {
      const auto place = static_cast<double>(j);
      const double before = j > 0 ? (t + n - place) * w[j - 1] : 0.0;
      const double here = j < d ? (place + 1.0 - t) * w[j] : 0.0;
      w[j] = (before + here) / n;
    }
  }
  return w;
}

}  // namespace

UniformSpline::UniformSpline(double from, double to, std::size_t intervals)
    : from_(from),
      to_(to),
      spacing_((to - from) / static_cast<double>(intervals)),
      coefficients_(intervals + kDegree, 0.0) {
  if (!(to > from) || intervals < 1) throw std::invalid_argument("a spline needs an interval");
}

double UniformSpline::centre(std::size_t k) const {
  return from_ + spacing_ * (static_cast<double>(k) - 0.5 * (kDegree - 1));
}

UniformSpline::Place UniformSpline::place(double x) const {
  const double position = (x - from_) / spacing_;
  const double last = static_cast<double>(coefficients_.size() - kWidth);
  const double interval = std::clamp(std::floor(position), 0.0, last);
  return {static_cast<std::size_t>(interval), position - interval};
}

UniformSpline::Basis UniformSpline::at(double x) const {
  const auto [interval, t] = place(x);
  return {interval, splines(kDegree, t)};
}

double UniformSpline::value(double x) const {
  const Basis b = at(x);
  double sum = 0.0;
  for (std::size_t k = 0; k < kWidth; ++k) sum += b.weights[k] * coefficients_[b.first + k];
  return sum;
}

double UniformSpline::slope(double x) const {
  const auto [interval, t] = place(x);
  // The derivative is a spline of the coefficients' differences, one degree lower.
  const std::array<double, kWidth> lower = splines(kDegree - 1, t);
  double sum = 0.0;
  for (std::size_t k = 0; k < kDegree; ++k) {
    sum += lower[k] * (coefficients_[interval + k + 1] - coefficients_[interval + k]);
  }
  return sum / spacing_;
}

double UniformSpline::extent() const {
  double least = value(from_), most = least;
  for (std::size_t i = 1; i <= coefficients_.size() - kDegree; ++i) {
    const double v = value(from_ + spacing_ * static_cast<double>(i));
    least = std::min(least, v);
    most = std::max(most, v);
  }
  return most - least;
}

void UniformSpline::follow(const std::vector<double>& values) {
  if (values.size() != size()) throw std::invalid_argument("one value per coefficient");
  coefficients_ = values;
  for (std::size_t k = 1; k + 1 < values.size(); ++k) {
    coefficients_[k] -= (values[k + 1] - 2.0 * values[k] + values[k - 1]) / 4.0;
  }
}

SplineFit::SplineFit(const UniformSpline& shape)
    : shape_(shape), bands_(shape.size()), right_(shape.size(), 0.0) {}

void SplineFit::add(double x, double g, double r) {
  const UniformSpline::Basis b = shape_.at(x);
  for (std::size_t i = 0; i < kWidth; ++i) {
    const double gi = g * b.weights[i];
    right_[b.first + i] += gi * r;
    for (std::size_t k = i; k < kWidth; ++k) bands_[b.first + i][k - i] += gi * g * b.weights[k];
  }
}

std::vector<double> SplineFit::solve() const {
  const auto n = static_cast<int>(right_.size());
  double largest = 0.0;
  for (const auto& row : bands_) largest = std::max(largest, row[0]);
  if (!(largest > 0.0)) return std::vector<double>(right_.size(), 0.0);
  std::vector<Eigen::Triplet<double>> entries;
  for (int i = 0; i < n; ++i) {
    for (int k = 0; k < static_cast<int>(kWidth) && i + k < n; ++k) {
      entries.emplace_back(i + k, i,
                           bands_[static_cast<std::size_t>(i)][static_cast<std::size_t>(k)]);
    }
    // Holds a coefficient that no look weighs, far below what any look says.
    entries.emplace_back(i, i, 1e-14 * largest);
  }
  Eigen::SparseMatrix<double> matrix(n, n);
  matrix.setFromTriplets(entries.begin(), entries.end());
  const Eigen::SimplicialLDLT<Eigen::SparseMatrix<double>, Eigen::Lower> solver(matrix);
  const Eigen::VectorXd solution =
      solver.solve(Eigen::Map<const Eigen::VectorXd>(right_.data(), n));
  return {solution.begin(), solution.end()};
}

double SplineFit::product(const std::vector<double>& a, const std::vector<double>& b) const {
  double sum = 0.0;
  for (std::size_t i = 0; i < bands_.size(); ++i) {
    sum += bands_[i][0] * a[i] * b[i];
    for (std::size_t k = 1; k < kWidth && i + k < bands_.size(); ++k) {
      sum += bands_[i][k] * (a[i] * b[i + k] + a[i + k] * b[i]);
    }
  }
  return sum;
}

double SplineFit::weight() const {
  // B-splines sum to 1: equal coefficients are a constant.
  const std::vector<double> ones(bands_.size(), 1.0);
  return product(ones, ones);
}

double SplineFit::departure(const std::vector<double>& coefficients) const {
  const std::vector<double> ones(coefficients.size(), 1.0);
  const double all = weight();
  if (!(all > 0.0)) return 0.0;
  std::vector<double> moved = coefficients;
  const double constant = product(ones, coefficients) / all;
  for (double& c : moved) c -= constant;
  return std::max(0.0, product(moved, moved));
}

}  // namespace kneeprint
