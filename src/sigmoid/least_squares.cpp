// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/least_squares.h"

#include <ceres/ceres.h>

#include <Eigen/Dense>
#include <algorithm>
#include <cmath>
#include <cstddef>
#include <limits>
#include <numeric>
#include <utility>

namespace kneeprint {
namespace {

using RowMajor = Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor>;

class Cost : public ceres::CostFunction {
 public:
  explicit Cost(const LeastSquaresProblem& problem) : problem_(problem) {
    set_num_residuals(problem.residuals);
    mutable_parameter_block_sizes()->push_back(problem.parameters);
  }

  bool Evaluate(double const* const* x, double* r, double** jacobians) const override {
    const auto n = static_cast<std::size_t>(problem_.residuals);
    const auto k = static_cast<std::size_t>(problem_.parameters);
    std::span<double> jacobian;
    if (jacobians != nullptr && jacobians[0] != nullptr) jacobian = {jacobians[0], n * k};
    return problem_.evaluate({x[0], k}, {r, n}, jacobian);
  }

 private:
  const LeastSquaresProblem& problem_;
};

double sum_of_squares(const LeastSquaresProblem& problem, std::span<const double> x) {
  std::vector<double> r(static_cast<std::size_t>(problem.residuals));
  if (!problem.evaluate(x, r, {})) return std::numeric_limits<double>::infinity();
  return std::inner_product(r.begin(), r.end(), r.begin(), 0.0);
}

LeastSquaresSolution solve(const LeastSquaresProblem& problem, std::vector<double> start,
                           const LeastSquaresOptions& options) {
  LeastSquaresSolution result{std::move(start), 0.0, false};
  std::vector<double>& x = result.x;
  ceres::Problem::Options ownership;
  Cost cost(problem);
  ownership.cost_function_ownership = ceres::DO_NOT_TAKE_OWNERSHIP;
  ceres::Problem p(ownership);
  p.AddResidualBlock(&cost, nullptr, x.data());
  for (std::size_t j = 0; j < problem.low.size(); ++j) {
    p.SetParameterLowerBound(x.data(), static_cast<int>(j), problem.low[j]);
    p.SetParameterUpperBound(x.data(), static_cast<int>(j), problem.high[j]);
  }

  ceres::Solver::Options o;
  o.linear_solver_type = ceres::DENSE_QR;
  o.logging_type = ceres::SILENT;
  o.num_threads = 1;
  o.max_num_iterations = options.most_iterations;
  o.function_tolerance = options.tolerance;
  o.parameter_tolerance = options.tolerance;
  o.gradient_tolerance = 0.0;  // absolute in Ceres: it would depend on the residuals' unit
  ceres::Solver::Summary summary;
  ceres::Solve(o, &p, &summary);
  result.sum_of_squares = 2.0 * summary.final_cost;
  result.converged = summary.termination_type == ceres::CONVERGENCE;
  return result;
}

std::vector<std::size_t> free_parameters(const LeastSquaresProblem& problem,
                                         const std::vector<double>& x) {
  std::vector<std::size_t> free;
  for (std::size_t j = 0; j < x.size(); ++j) {
    const bool pinned = !problem.low.empty() && (x[j] <= problem.low[j] || x[j] >= problem.high[j]);
    if (!pinned) free.push_back(j);
  }
  return free;
}

/// Whether the sum of squares falls towards the outside for every parameter at a bound (the
/// conditions of Karush, Kuhn and Tucker).
bool stays_at_bounds(const LeastSquaresProblem& problem, const std::vector<double>& x) {
  std::vector<double> r(static_cast<std::size_t>(problem.residuals));
  std::vector<double> jacobian(r.size() * x.size());
  if (!problem.evaluate(x, r, jacobian)) return true;
  for (std::size_t j = 0; j < x.size(); ++j) {
    double slope = 0.0;
    for (std::size_t i = 0; i < r.size(); ++i) slope += r[i] * jacobian[i * x.size() + j];
    if (x[j] <= problem.low[j] && slope < 0.0) return false;
    if (x[j] >= problem.high[j] && slope > 0.0) return false;
  }
  return true;
}

/// The same problem with every other parameter held where `x` has it.
LeastSquaresProblem restricted(const LeastSquaresProblem& problem,
                               const std::vector<std::size_t>& free, std::vector<double> x) {
  LeastSquaresProblem r;
  r.residuals = problem.residuals;
  r.parameters = static_cast<int>(free.size());
  for (const std::size_t j : free) {
    r.low.push_back(problem.low[j]);
    r.high.push_back(problem.high[j]);
  }
  r.evaluate = [&problem, free, x = std::move(x)](std::span<const double> some,
                                                  std::span<double> residuals,
                                                  std::span<double> jacobian) mutable {
    for (std::size_t i = 0; i < free.size(); ++i) x[free[i]] = some[i];
    std::vector<double> full(jacobian.empty() ? 0 : residuals.size() * x.size());
    if (!problem.evaluate(x, residuals, full)) return false;
    for (std::size_t row = 0; !jacobian.empty() && row < residuals.size(); ++row) {
      for (std::size_t i = 0; i < free.size(); ++i) {
        jacobian[row * free.size() + i] = full[row * x.size() + free[i]];
      }
    }
    return true;
  };
  return r;
}

}  // namespace

LeastSquaresSolution least_squares(const LeastSquaresProblem& problem, std::vector<double> start,
                                   const LeastSquaresOptions& options) {
  constexpr int kMostRounds = 4;
  for (std::size_t j = 0; j < problem.low.size(); ++j) {
    start[j] = std::clamp(start[j], problem.low[j], problem.high[j]);
  }
  if (const double first = sum_of_squares(problem, start); !std::isfinite(first)) {
    return {std::move(start), std::numeric_limits<double>::infinity(), false};
  }
  LeastSquaresSolution s = solve(problem, std::move(start), options);

  // Ceres projects its steps onto the bounds and can stall on one. So the others are searched with
  // those at a bound held, and then all once more where one of these wants to come off again.
  for (int round = 0; round < kMostRounds; ++round) {
    const std::vector<std::size_t> free = free_parameters(problem, s.x);
    if (free.empty() || free.size() == s.x.size()) break;
    std::vector<double> some;
    for (const std::size_t j : free) some.push_back(s.x[j]);
    const LeastSquaresSolution held = solve(restricted(problem, free, s.x), some, options);
    for (std::size_t i = 0; i < free.size(); ++i) s.x[free[i]] = held.x[i];
    s.sum_of_squares = held.sum_of_squares;
    s.converged = held.converged;
    if (stays_at_bounds(problem, s.x)) break;
    s = solve(problem, std::move(s.x), options);
  }
  return s;
}

std::vector<double> inverse_fisher(const LeastSquaresProblem& problem, std::span<const double> x) {
  constexpr double kUnseen = 1e-12;
  const auto k = problem.parameters;
  std::vector<double> r(static_cast<std::size_t>(problem.residuals));
  RowMajor jacobian = RowMajor::Zero(problem.residuals, k);
  problem.evaluate(x, r, {jacobian.data(), static_cast<std::size_t>(jacobian.size())});

  Eigen::VectorXd scale = jacobian.colwise().norm().transpose();
  const auto or_one = [](double largest) { return largest > 0.0 ? largest : 1.0; };
  scale = scale.cwiseMax(kUnseen * or_one(scale.maxCoeff()));
  const Eigen::MatrixXd scaled = jacobian * scale.cwiseInverse().asDiagonal();
  const Eigen::JacobiSVD<Eigen::MatrixXd> svd(scaled, Eigen::ComputeThinV);
  const Eigen::VectorXd values =
      svd.singularValues().cwiseMax(kUnseen * or_one(svd.singularValues().maxCoeff()));
  const Eigen::MatrixXd root =
      scale.cwiseInverse().asDiagonal() * svd.matrixV() * values.cwiseInverse().asDiagonal();
  const RowMajor covariance = root * root.transpose();
  return {covariance.data(), covariance.data() + covariance.size()};
}

}  // namespace kneeprint
