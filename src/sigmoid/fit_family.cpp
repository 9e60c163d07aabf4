// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/fit_family.h"

#include <algorithm>
#include <boost/math/tools/minima.hpp>
#include <cmath>
#include <limits>
#include <utility>

namespace kneeprint {
namespace {

constexpr double kAccuracy = 1e-12;      // of the quadrature: far below any converter's noise
constexpr double kLooseAccuracy = 1e-6;  // to tell starts apart
constexpr LeastSquaresOptions kLoose{40, 1e-6};
constexpr LeastSquaresOptions kTight{200, 1e-13};
constexpr double kNormal95 = 1.959963984540054;  // 0.975 quantile of the normal distribution
constexpr double kMostLogSpread = 14.0;          // of ln: a factor of a million tells nothing anyway

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

  /// The best fit without discrepancy, and the best with one.
  std::pair<Trial, Trial> run() {
    // Where the largest harmonic counts and the small ones do not yet: few local minima.
    const double first = std::clamp(0.1 * data_.largest_harmonic(), 1e-6, 1e-2);
    std::vector<LeastSquaresSolution> found;
    const LeastSquaresProblem loose = problem_.at(first, kLooseAccuracy);
    for (Fitted& start : problem_.starts(first)) {
      found.push_back(least_squares(loose, std::move(start), kLoose));
    }
    std::stable_sort(found.begin(), found.end(),
                     [](const LeastSquaresSolution& a, const LeastSquaresSolution& b) {
                       return a.sum_of_squares < b.sum_of_squares;
                     });
    if (found.empty()) return {};

    // Down from there in steps, each fit beginning at the one before; then up.
    const double least = 0.1 * data_.smallest_u();
    std::vector<Trial> trials{trial(first, found.front().x)};
    for (double d = first / kStep; d > least; d /= kStep) {
      trials.push_back(trial(d, trials.back().solution.x));
    }
    Trial without = trial(0.0, trials.back().solution.x);
    std::reverse(trials.begin(), trials.end());
    for (double d = first * kStep; d < 1.0; d *= kStep) {
      trials.push_back(trial(d, trials.back().solution.x));
    }
    Trial with = refined(*std::min_element(trials.begin(), trials.end(), better));

    // The other starts once more, now with the final weights.
    for (std::size_t i = 1; i < found.size(); ++i) {
      without = std::min(without, quick(without.discrepancy, found[i].x), better);
      with = std::min(with, quick(with.discrepancy, found[i].x), better);
    }
    return {polished(without), polished(with)};
  }

 private:
  static constexpr double kStep = 10.0;

  Trial trial(double discrepancy, const Fitted& start, double accuracy = kAccuracy,
              const LeastSquaresOptions& options = kTight) {
    Trial t{discrepancy, least_squares(problem_.at(discrepancy, accuracy), start, options), 0.0};
    t.minus_2_log_likelihood = t.solution.sum_of_squares + data_.log_variances(discrepancy);
    return t;
  }

  Trial quick(double discrepancy, const Fitted& start) {
    return trial(discrepancy, start, kAccuracy, kLoose);
  }

  Trial polished(const Trial& t) { return trial(t.discrepancy, t.solution.x); }

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

double reach_of(const SigmoidFamily& family, const SigmoidParameters& p, double input_peak) {
  const double swing = p.drive * input_peak;
  return 0.5 * (family.value(p.bias + swing, p.sharpness) -
                family.value(p.bias - swing, p.sharpness));
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

  const Fitted& x = best.solution.x;
  const SigmoidParameters p = search.problem().parameters(x);
  f.converged = best.solution.converged && !search.problem().degenerate(x);

  const LeastSquaresProblem measured = search.problem().at(0.0, kAccuracy);
  std::vector<double> r(static_cast<std::size_t>(f.data));
  measured.evaluate(x, r, {});
  for (const double one : r) f.chi_square += one * one;

  const std::vector<double> covariance =
      inverse_fisher(search.problem().at(best.discrepancy, kAccuracy), x);
  const auto u = [&](std::size_t j) { return std::sqrt(covariance[j * x.size() + j]); };
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
