// SPDX-License-Identifier: GPL-3.0-or-later
// A slow curve: a cubic spline on equidistant knots, and its least-squares fit to many noisy looks.
#pragma once

#include <array>
#include <cstddef>
#include <vector>

namespace kneeprint {

/// Sum of cubic B-splines (de Boor, A Practical Guide to Splines, 1978, ch. IX) over [from, to] in
/// `intervals` equal intervals: intervals + 3 coefficients, 0 at first. Fitted to a sine of f
/// cycles per interval it errs by sqrt(2 zeta(8)) f^4 of the sine's amplitude to first order
/// (leading term of the spline's approximation error; Blu and Unser 1999, from memory).
class UniformSpline {
 public:
  /// to > from, intervals >= 1; else std::invalid_argument (a programming error).
  UniformSpline(double from, double to, std::size_t intervals);

  std::size_t size() const { return coefficients_.size(); }
  double from() const { return from_; }
  double to() const { return to_; }
  /// Where coefficient k weighs most; the first and the last stand one interval outside.
  double centre(std::size_t k) const;
  const std::vector<double>& coefficients() const { return coefficients_; }
  std::vector<double>& coefficients() { return coefficients_; }

  /// The four splines that are not 0 at x; outside [from, to] the end polynomials go on.
  struct Basis {
    std::size_t first = 0;
    std::array<double, 4> weights{};
  };
  Basis at(double x) const;
  double value(double x) const;
  double slope(double x) const;

  /// The curve through or near `values`, given at the centres; cubics are met exactly, but for the
  /// outermost coefficients (quasi-interpolation: c = v - v''/6; de Boor 1978, ch. XII).
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
  std::vector<std::array<double, 4>> bands_;  // [i][k]: entry (i, i + k) of the symmetric matrix
  std::vector<double> right_;
};

}  // namespace kneeprint
