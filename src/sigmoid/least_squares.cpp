// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/least_squares.h"

#include <ceres/ceres.h>

#include <Eigen/Dense>
#include <algorithm>
#include <cmath>
#include <cstddef>
#include <limits>

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

}  // namespace

LeastSquaresSolution least_squares(const LeastSquaresProblem& problem, std::vector<double> start,
                                   const LeastSquaresOptions& options) {
  LeastSquaresSolution result{std::move(start), std::numeric_limits<double>::infinity(), false};
  std::vector<double>& x = result.x;

  ceres::Problem::Options ownership;
  Cost cost(problem);
  ownership.cost_function_ownership = ceres::DO_NOT_TAKE_OWNERSHIP;
  ceres::Problem p(ownership);
  p.AddResidualBlock(&cost, nullptr, x.data());
  if (!problem.low.empty()) {
    for (int j = 0; j < problem.parameters; ++j) {
      const auto at = static_cast<std::size_t>(j);
      x[at] = std::clamp(x[at], problem.low[at], problem.high[at]);
      p.SetParameterLowerBound(x.data(), j, problem.low[at]);
      p.SetParameterUpperBound(x.data(), j, problem.high[at]);
    }
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

  if (summary.termination_type == ceres::FAILURE) return result;
  result.sum_of_squares = 2.0 * summary.final_cost;
  result.converged = summary.termination_type == ceres::CONVERGENCE;
  return result;
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
