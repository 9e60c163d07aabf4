// SPDX-License-Identifier: GPL-3.0-or-later
// Harmonics of a known curve with seeded noise, as a measurement would give them.
#pragma once

#include <cmath>
#include <cstdint>
#include <numbers>
#include <random>
#include <vector>

#include "sigmoid/fit.h"
#include "sigmoid/predict.h"

namespace kneeprint::testing {

/// Standard normal numbers, the same with every standard library (Box & Muller 1958).
class Gaussian {
 public:
  explicit Gaussian(std::uint64_t seed) : engine_(seed) {}
  double operator()() {
    const double radius = std::sqrt(-2.0 * std::log(uniform()));
    return radius * std::cos(2.0 * std::numbers::pi * uniform());
  }

 private:
  double uniform() { return (static_cast<double>(engine_() >> 11) + 0.5) * 0x1p-53; }
  std::mt19937_64 engine_;
};

struct Ladder {
  int drives = 20;
  double lowest_db = -40.0, highest_db = 0.0;  ///< input peak re 1
  int first_order = 1, last_order = 10;
  double lowest_u_db = -150.0, highest_u_db = -120.0;  ///< noise at the lowest and highest drive
};

inline double from_db(double db) { return std::pow(10.0, db / 20.0); }

/// In-phase parts: the curve's harmonics plus Gaussian noise of standard deviation u.
inline std::vector<FitDatum> measured(const SigmoidFamily& family, const SigmoidParameters& truth,
                                      std::uint64_t seed, const Ladder& ladder = {}) {
  // A fixed rule of many points, not the adaptive one of the fit.
  constexpr int kPoints = 16384;
  Gaussian noise(seed);
  std::vector<FitDatum> data;
  for (int i = 0; i < ladder.drives; ++i) {
    const double along = static_cast<double>(i) / (ladder.drives - 1);
    const double input = from_db(ladder.lowest_db + along * (ladder.highest_db - ladder.lowest_db));
    const double u =
        from_db(ladder.lowest_u_db + along * (ladder.highest_u_db - ladder.lowest_u_db));
    const std::vector<double> h = sine_harmonics(
        [&](double x) { return evaluate(family, truth, x); }, input, ladder.last_order, kPoints);
    for (int n = ladder.first_order; n <= ladder.last_order; ++n) {
      data.push_back({input, n, h[static_cast<std::size_t>(n)] + u * noise(), u, true});
    }
  }
  return data;
}

}  // namespace kneeprint::testing
