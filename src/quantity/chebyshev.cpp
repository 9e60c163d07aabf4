// SPDX-License-Identifier: GPL-3.0-or-later
#include "quantity/chebyshev.h"

#include <cmath>
#include <numbers>

namespace kneeprint {

ChebyshevCurve::ChebyshevCurve(const std::function<double(double)>& f, double low, double high,
                               std::size_t points) {
  for (std::size_t k = 0; k <= points; ++k) {
    const bool end = k == 0 || k == points;
    const double c =
        std::cos(std::numbers::pi * static_cast<double>(k) / static_cast<double>(points));
    x_.push_back(k == 0 ? high : k == points ? low : 0.5 * (low + high) + 0.5 * (high - low) * c);
    y_.push_back(f(x_.back()));
    weight_.push_back((k % 2 == 0 ? 1.0 : -1.0) * (end ? 0.5 : 1.0));
  }
}

// Barycentric formula of the second form (Berrut & Trefethen 2004, eq. 4.2, with the weights of
// eq. 5.4 for Chebyshev points of the second kind).
double ChebyshevCurve::operator()(double x) const {
  double above = 0.0, below = 0.0;
  for (std::size_t k = 0; k < x_.size(); ++k) {
    if (x == x_[k]) return y_[k];
    const double share = weight_[k] / (x - x_[k]);
    above += share * y_[k];
    below += share;
  }
  return above / below;
}

}  // namespace kneeprint
