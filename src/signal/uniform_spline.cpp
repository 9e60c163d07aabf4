// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/uniform_spline.h"

#include <Eigen/SparseCholesky>
#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace kneeprint {

UniformSpline::UniformSpline(double from, double to, std::size_t intervals)
    : from_(from),
      to_(to),
      spacing_((to - from) / static_cast<double>(intervals)),
      coefficients_(intervals + 3, 0.0) {
  if (!(to > from) || intervals < 1) throw std::invalid_argument("a spline needs an interval");
}

double UniformSpline::centre(std::size_t k) const {
  return from_ + spacing_ * (static_cast<double>(k) - 1.0);
}

UniformSpline::Place UniformSpline::place(double x) const {
  const double position = (x - from_) / spacing_;
  const double last = static_cast<double>(coefficients_.size() - 4);
  const double interval = std::clamp(std::floor(position), 0.0, last);
  return {static_cast<std::size_t>(interval), position - interval};
}

UniformSpline::Basis UniformSpline::at(double x) const {
  const auto [interval, t] = place(x);
  const double r = 1.0 - t;
  return {interval,
          {r * r * r / 6.0, (3.0 * t * t * t - 6.0 * t * t + 4.0) / 6.0,
           (3.0 * r * r * r - 6.0 * r * r + 4.0) / 6.0, t * t * t / 6.0}};
}

double UniformSpline::value(double x) const {
  const Basis b = at(x);
  double sum = 0.0;
  for (std::size_t k = 0; k < 4; ++k) sum += b.weights[k] * coefficients_[b.first + k];
  return sum;
}

double UniformSpline::slope(double x) const {
  const auto [interval, t] = place(x);
  const double r = 1.0 - t;
  // Derivatives of the weights above.
  const std::array<double, 4> weights{-0.5 * r * r, 1.5 * t * t - 2.0 * t, -1.5 * r * r + 2.0 * r,
                                      0.5 * t * t};
  double sum = 0.0;
  for (std::size_t k = 0; k < 4; ++k) sum += weights[k] * coefficients_[interval + k];
  return sum / spacing_;
}

void UniformSpline::follow(const std::vector<double>& values) {
  if (values.size() != size()) throw std::invalid_argument("one value per coefficient");
  coefficients_ = values;
  for (std::size_t k = 1; k + 1 < values.size(); ++k) {
    coefficients_[k] -= (values[k + 1] - 2.0 * values[k] + values[k - 1]) / 6.0;
  }
}

SplineFit::SplineFit(const UniformSpline& shape)
    : shape_(shape), bands_(shape.size()), right_(shape.size(), 0.0) {}

void SplineFit::add(double x, double g, double r) {
  const UniformSpline::Basis b = shape_.at(x);
  for (std::size_t i = 0; i < 4; ++i) {
    const double gi = g * b.weights[i];
    right_[b.first + i] += gi * r;
    for (std::size_t k = i; k < 4; ++k) bands_[b.first + i][k - i] += gi * g * b.weights[k];
  }
}

std::vector<double> SplineFit::solve() const {
  const auto n = static_cast<int>(right_.size());
  double largest = 0.0;
  for (const auto& row : bands_) largest = std::max(largest, row[0]);
  if (!(largest > 0.0)) return std::vector<double>(right_.size(), 0.0);
  std::vector<Eigen::Triplet<double>> entries;
  for (int i = 0; i < n; ++i) {
    for (int k = 0; k < 4 && i + k < n; ++k) {
      entries.emplace_back(i + k, i,
                           bands_[static_cast<std::size_t>(i)][static_cast<std::size_t>(k)]);
    }
    // Holds a coefficient that no look weighs, far below what any look says.
    entries.emplace_back(i, i, 1e-12 * largest);
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
    for (std::size_t k = 1; k < 4 && i + k < bands_.size(); ++k) {
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
