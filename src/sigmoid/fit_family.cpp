// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/fit_family.h"

#include <algorithm>
#include <boost/math/tools/minima.hpp>
#include <cmath>
#include <limits>
#include <utility>

#include "quantity/failure.h"

namespace kneeprint {
namespace {

// Of the sum of squares, which is about the number of data at the right weights: 1e-8 is a
// thousandth of a standard error.
constexpr LeastSquaresOptions kLoose{30, 1e-5}, kFair{60, 1e-8}, kFine{200, 1e-12};
constexpr double kNormal95 = 1.959963984540054;  // 0.975 quantile of the normal distribution
constexpr double kMostDiscrepancy = 10.0;        // of the distortion: nothing of it is described
constexpr double kMostLogSpread = 14.0;  // of ln: a factor of a million tells nothing anyway

/// The fit at one discrepancy. -2 ln L up to the constant n ln(2 pi).
struct Trial {
  double discrepancy = 0.0;
  LeastSquaresSolution solution;
  double minus_2_log_likelihood = std::numeric_limits<double>::infinity();
};

bool better(const Trial& a, const Trial& b) {
  return a.minus_2_log_likelihood < b.minus_2_log_likelihood;
}

// Corrected Akaike criterion: Hurvich & Tsai, Biometrika 76 (1989) 297.
double aicc(double minus_2_log_likelihood, int data, int parameters) {
  const double n = data, k = parameters;
  return minus_2_log_likelihood + 2.0 * k + 2.0 * k * (k + 1.0) / (n - k - 1.0);
}

class Search {
 public:
  Search(const SigmoidFamily& family, const HarmonicData& data)
      : data_(data), problem_(data, family) {}

  HarmonicProblem& problem() { return problem_; }

  /// The best fit without discrepancy, and the best with one. Throws NothingUsable when no rising
  /// curve fits at all.
  std::pair<Trial, Trial> run() {
    // A tenth of each drive's distortion: where the large harmonics count and the small ones do not
    // yet, there are few local minima.
    const double first = 0.1;
    const Shape start = best_start(first);

    // Down from there in steps, each fit beginning at the one before; then up.
    const double least = 0.1 * data_.smallest_sigma(0.0) / data_.largest_distortion();
    std::vector<Trial> trials{trial(first, start)};
    for (double d = first / kStep; d > least; d /= kStep) {
      trials.push_back(trial(d, trials.back().solution.x));
    }
    Trial without = trial(0.0, trials.back().solution.x);
    std::reverse(trials.begin(), trials.end());
    for (double d = first * kStep; d <= kMostDiscrepancy; d *= kStep) {
      trials.push_back(trial(d, trials.back().solution.x));
    }
    Trial with = *std::min_element(trials.begin(), trials.end(), better);

    // From the grid once more, with the weights that came out.
    without = restarted(std::move(without));
    with = refined(restarted(std::move(with)));
    return {polished(without), polished(with)};
  }

 private:
  static constexpr double kStep = 10.0;

  Trial trial(double discrepancy, const Shape& start, const LeastSquaresOptions& options = kFair) {
    Trial t{discrepancy, least_squares(problem_.over_shapes(discrepancy), start, options), 0.0};
    t.minus_2_log_likelihood = t.solution.sum_of_squares + data_.log_variances(discrepancy);
    return t;
  }

  Shape best_start(double discrepancy) {
    const LeastSquaresProblem problem = problem_.over_shapes(discrepancy);
    LeastSquaresSolution best{{}, std::numeric_limits<double>::infinity(), false};
    for (Shape& start : problem_.starts(discrepancy)) {
      LeastSquaresSolution s = least_squares(problem, std::move(start), kLoose);
      if (s.sum_of_squares < best.sum_of_squares) best = std::move(s);
    }
    if (best.x.empty()) {
      throw NothingUsable(
          "no curve fits the harmonics: found no fundamental that rises with the drive; expected "
          "one "
          "in phase with the input (is there any output, and is it given upright?)");
    }
    return std::move(best.x);
  }

  /// `t`, or what the grid's best starts lead to where that is better.
  Trial restarted(Trial t) {
    const double before = t.minus_2_log_likelihood;
    for (const Shape& start : problem_.starts(t.discrepancy)) {
      Trial other = trial(t.discrepancy, start, kLoose);
      if (better(other, t)) t = std::move(other);
    }
    return t.minus_2_log_likelihood < before ? trial(t.discrepancy, t.solution.x) : t;
  }

  Trial polished(const Trial& t) { return trial(t.discrepancy, t.solution.x, kFine); }

  /// The discrepancy between the neighbours of `t` that is likeliest (Brent, Algorithms for
  /// Minimization without Derivatives, 1973, ch. 5), every other parameter fitted anew at each.
  Trial refined(Trial t) {
    constexpr int kBits = 10;  // 0.1 % of the bracket
    std::uintmax_t most = 30;
    const double centre = std::log(t.discrepancy);
    boost::math::tools::brent_find_minima(
        [&](double log_d) {
          const Trial next = trial(std::exp(log_d), t.solution.x);
          if (better(next, t)) t = next;
          return next.minus_2_log_likelihood;
        },
        centre - std::log(kStep), centre + std::log(kStep), kBits, most);
    return t;
  }

  const HarmonicData& data_;
  HarmonicProblem problem_;
};

/// A positive parameter known by its logarithm.
FittedParameter positive(double value, double log_u) {
  log_u = std::min(log_u, kMostLogSpread / kNormal95);
  const double factor = std::exp(kNormal95 * log_u);
  return {value, value * log_u, value / factor, value * factor};
}

// What all drives of an order have in common shifts the parameters together: by C J^T f, with f the
// shift of every residual, for each order on its own (fully correlated inputs, JCGM 100:2008 5.2.2
// note 1). Added to the covariance C in place.
void add_common_part(std::vector<double>& covariance, const HarmonicData& data, double discrepancy,
                     const LeastSquaresProblem& problem, const std::vector<double>& x) {
  const auto rows = static_cast<std::size_t>(problem.residuals);
  const std::size_t width = x.size();
  std::vector<double> r(rows), jacobian(rows * width);
  problem.evaluate(x, r, jacobian);
  std::vector<std::vector<double>> gradient(static_cast<std::size_t>(data.orders()) + 1,
                                            std::vector<double>(width, 0.0));
  std::size_t row = 0;
  for (const HarmonicData::Rung& rung : data.rungs()) {
    for (const FitDatum& d : rung.data) {
      const double shift = d.common_u / rung.sigma(d, discrepancy);
      for (std::size_t j = 0; j < width; ++j) {
        gradient[static_cast<std::size_t>(d.order)][j] += jacobian[row * width + j] * shift;
      }
      ++row;
    }
  }
  const std::vector<double> statistical = covariance;
  for (const std::vector<double>& g : gradient) {
    std::vector<double> moved(width, 0.0);
    for (std::size_t i = 0; i < width; ++i) {
      for (std::size_t j = 0; j < width; ++j) moved[i] += statistical[i * width + j] * g[j];
    }
    for (std::size_t i = 0; i < width; ++i) {
      for (std::size_t j = 0; j < width; ++j) covariance[i * width + j] += moved[i] * moved[j];
    }
  }
}

double reach_of(const SigmoidFamily& family, const SigmoidParameters& p, double input_peak) {
  const double swing = p.drive * input_peak;
  return 0.5 *
         (family.value(p.bias + swing, p.sharpness) - family.value(p.bias - swing, p.sharpness));
}

}  // namespace

FittedFamily fit_family(const SigmoidFamily& family, const HarmonicData& data,
                        const FitOptions& options) {
  Search search(family, data);
  const auto [without, with] = search.run();

  FittedFamily f;
  f.family = &family;
  f.data = data.size();
  const int curve_parameters = family.has_sharpness ? 4 : 3;
  const double plain = aicc(without.minus_2_log_likelihood, f.data, curve_parameters);
  const double discrepant = aicc(with.minus_2_log_likelihood, f.data, curve_parameters + 1);
  const bool reaches = plain <= discrepant;
  const Trial& best = reaches ? without : with;
  f.aicc = reaches ? plain : discrepant;
  f.parameters = curve_parameters + (reaches ? 0 : 1);
  f.discrepancy = best.discrepancy;

  HarmonicProblem& problem = search.problem();
  const Shape& shape = best.solution.x;
  const SigmoidParameters p = problem.parameters(shape, best.discrepancy);
  f.converged = best.solution.converged && !problem.degenerate(shape);

  Shape all{std::log(p.limit)};
  all.insert(all.end(), shape.begin(), shape.end());
  std::vector<double> r(static_cast<std::size_t>(f.data));
  problem.over_all(0.0).evaluate(all, r, {});
  for (const double one : r) f.chi_square += one * one;

  const LeastSquaresProblem over_all = problem.over_all(best.discrepancy);
  std::vector<double> covariance = inverse_fisher(over_all, all);
  add_common_part(covariance, data, best.discrepancy, over_all, all);
  const auto u = [&](std::size_t j) { return std::sqrt(covariance[j * all.size() + j]); };
  f.limit = positive(p.limit, std::hypot(u(0), options.return_relative_u));
  f.drive = positive(p.drive, std::hypot(u(1), options.send_relative_u));
  f.bias = {p.bias, u(2), p.bias - kNormal95 * u(2), p.bias + kNormal95 * u(2)};
  if (family.has_sharpness) {
    f.sharpness = positive(p.sharpness, u(3));
    f.sharpness->low95 = std::max(f.sharpness->low95, family.sharpness_low);
    f.sharpness->high95 = std::min(f.sharpness->high95, family.sharpness_high);
  }
  f.reach = reach_of(family, p, data.strongest_input());
  f.extrapolated = f.reach < 0.8;
  return f;
}

}  // namespace kneeprint
