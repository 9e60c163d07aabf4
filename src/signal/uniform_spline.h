// SPDX-License-Identifier: GPL-3.0-or-later
// A slow curve: a quintic spline on equidistant knots, and its least-squares fit to many noisy
// looks.
#pragma once

#include <array>
#include <cstddef>
#include <vector>

namespace kneeprint {

/// Sum of quintic B-splines (de Boor, A Practical Guide to Splines, 1978, ch. IX) over [from, to]
/// in `intervals` equal intervals: intervals + 5 coefficients, 0 at first. Fitted to a sine of f
/// cycles per interval it errs by about sqrt(2) f^6 of the sine's rms (leading term of the
/// approximation error, sqrt(2 zeta(12)) f^6; Blu and Unser 1999, from memory).
class UniformSpline {
 public:
  /// to > from, intervals >= 1; else std::invalid_argument (a programming error).
  UniformSpline(double from, double to, std::size_t intervals);

  std::size_t size() const { return coefficients_.size(); }
  double from() const { return from_; }
  double to() const { return to_; }
  /// Where coefficient k weighs most; the outer two at either end stand outside.
  double centre(std::size_t k) const;
  const std::vector<double>& coefficients() const { return coefficients_; }
  std::vector<double>& coefficients() { return coefficients_; }

  static constexpr std::size_t kWidth = 6;
  /// The splines that are not 0 at x; outside [from, to] the end polynomials go on.
  struct Basis {
    std::size_t first = 0;
    std::array<double, kWidth> weights{};
  };
  Basis at(double x) const;
  double value(double x) const;
  double slope(double x) const;
  /// Greatest less least value at the knots.
  double extent() const;

  /// The curve near `values`, given at the centres; parabolas are met exactly, but next to the ends
  /// (quasi-interpolation: c = v - v''/4, in intervals; de Boor 1978, ch. XII).
  void follow(const std::vector<double>& values);

 private:
  struct Place {
    std::size_t interval;
    double part;  // 0 .. 1 within it
  };
  Place place(double x) const;

  double from_, to_, spacing_;
  std::vector<double> coefficients_;
};

/// Normal equations of looks r_i = g_i * s(x_i) + noise for a spline s.
class SplineFit {
 public:
  /// Coefficients like those of `shape`.
  explicit SplineFit(const UniformSpline& shape);

  void add(double x, double g, double r);
  /// Least squares. Coefficients that no look weighs become 0.
  std::vector<double> solve() const;
  /// sum over the looks of g_i^2.
  double weight() const;
  /// sum over the looks of (g_i s(x_i))^2, s having these coefficients less the constant that makes
  /// the sum least: how far the curve is from a constant.
  double departure(const std::vector<double>& coefficients) const;

 private:
  double product(const std::vector<double>& a, const std::vector<double>& b) const;

  UniformSpline shape_;
  std::vector<std::array<double, UniformSpline::kWidth>>
      bands_;  // [i][k]: entry (i, i + k) of the symmetric matrix
  std::vector<double> right_;
};

}  // namespace kneeprint
