// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/oversample.h"

#include <algorithm>
#include <bit>
#include <boost/math/special_functions/bessel.hpp>
#include <cmath>
#include <numbers>
#include <stdexcept>

namespace kneeprint {
namespace {

// 6 dB under the promised 140 dB: two stages may add up.
constexpr double kAttenuationDb = 146.0;
constexpr double kPassEdge = 0.4535;  // of the base rate
constexpr double kStopEdge = 0.5465;

int stages_of(int factor) {
  if (factor < 1 || factor > 4096 || !std::has_single_bit(static_cast<unsigned>(factor))) {
    throw std::invalid_argument("oversampling factor must be a power of two from 1 to 4096");
  }
  return std::countr_zero(static_cast<unsigned>(factor));
}

// Length: Kaiser 1974, N - 1 = (A - 7.95) / (14.36 df); shape: beta = 0.1102 (A - 8.7).
std::vector<double> kaiser_weights(double transition) {
  const double taps = (kAttenuationDb - 7.95) / (14.36 * transition) + 1.0;
  const auto pairs = static_cast<std::size_t>(std::ceil((taps + 1.0) / 4.0));
  const double beta = 0.1102 * (kAttenuationDb - 8.7);
  std::vector<double> weights(pairs);
  double sum = 0.0;
  for (std::size_t k = 0; k < pairs; ++k) {
    const double position = 2.0 * static_cast<double>(k) + 1.0;  // in samples of the higher rate
    const double x = position / (2.0 * static_cast<double>(pairs));
    const double window = boost::math::cyl_bessel_i(0, beta * std::sqrt(1.0 - x * x));
    weights[k] = (k % 2 ? -1.0 : 1.0) / position * window;
    sum += 2.0 * weights[k];
  }
  for (double& w : weights) w /= sum;  // gain 1 at dc
  return weights;
}

// Weights of Lagrange interpolation midway between 2 `pairs` equidistant points.
std::vector<double> flat_weights(std::size_t pairs) {
  std::vector<double> weights(pairs);
  for (std::size_t k = 0; k < pairs; ++k) {
    const double node = static_cast<double>(k) + 0.5;
    double product = 0.5;  // the node at -node: node / (2 node)
    for (std::size_t j = 0; j < pairs; ++j) {
      const double other = static_cast<double>(j) + 0.5;
      if (j != k) product *= other * other / (other * other - node * node);
    }
    weights[k] = product;
  }
  return weights;
}

// The stop-band error of the flat half-band is at most binomial(2K-1, K) sin^2K(pi f), f being the
// edge of its pass-band (leading term of the regularised incomplete beta function); that shrinks
// with K only well inside the band.
std::size_t flat_pairs(double pass_edge) {
  constexpr std::size_t kTooMany = 64;
  const double s = std::pow(std::sin(std::numbers::pi * pass_edge), 2);
  double error = s;
  std::size_t pairs = 1;
  while (error > std::pow(10.0, -kAttenuationDb / 20.0) && pairs < kTooMany) {
    ++pairs;
    const double k = static_cast<double>(pairs);
    error *= s * (2.0 * k - 1.0) * (2.0 * k - 2.0) / (k * (k - 1.0));
  }
  return pairs;
}

// out[i] = sum_k w_k (x[i + K-1-k] + x[i + K+k]); the fixed inner count lets the compiler keep the
// sums in registers and use vector arithmetic without changing the order of any sum.
void midpoints(const double* x, std::size_t count, const std::vector<double>& weights,
               double* out) {
  constexpr std::size_t kLanes = 8;
  const std::size_t pairs = weights.size();
  std::size_t i = 0;
  for (; i + kLanes <= count; i += kLanes) {
    double sum[kLanes] = {};
    for (std::size_t k = 0; k < pairs; ++k) {
      const double w = weights[k];
      const double* before = x + i + pairs - 1 - k;
      const double* after = x + i + pairs + k;
      for (std::size_t j = 0; j < kLanes; ++j) sum[j] += w * (before[j] + after[j]);
    }
    std::copy_n(sum, kLanes, out + i);
  }
  for (; i < count; ++i) {
    double sum = 0.0;
    for (std::size_t k = 0; k < pairs; ++k) {
      sum += weights[k] * (x[i + pairs - 1 - k] + x[i + pairs + k]);
    }
    out[i] = sum;
  }
}

// Keeps the last `history` values at the front.
void keep_history(std::vector<double>& buffer, std::size_t history, std::size_t block) {
  std::copy_n(buffer.begin() + static_cast<std::ptrdiff_t>(block), history, buffer.begin());
}

}  // namespace

std::vector<double> halfband_midpoint_weights(int lower) {
  const double higher = 2.0 * lower;
  // Only next to the base rate is the band between the edges given up; above, it still carries
  // signal.
  const double pass_edge = (lower == 1 ? kPassEdge : kStopEdge) / higher;
  std::vector<double> kaiser = kaiser_weights(0.5 - 2.0 * pass_edge);
  const std::size_t pairs = flat_pairs(pass_edge);
  return pairs < kaiser.size() ? flat_weights(pairs) : kaiser;
}

Interpolator::Interpolator(int factor) : factor_(factor) {
  const int stages = stages_of(factor);
  for (int s = 0; s < stages; ++s) {
    Stage stage;
    stage.half = halfband_midpoint_weights(1 << s);
    stage.input.assign(2 * stage.half.size() - 1, 0.0);
    delay_ += stage.half.size() * static_cast<std::size_t>(factor >> s);
    stages_.push_back(std::move(stage));
  }
}

void Interpolator::process(std::span<const double> in, std::span<double> out) {
  if (out.size() != in.size() * static_cast<std::size_t>(factor_)) {
    throw std::invalid_argument("interpolator: output must be factor times as long as input");
  }
  if (stages_.empty()) {
    std::copy(in.begin(), in.end(), out.begin());
    return;
  }
  std::size_t count = in.size();
  const auto load = [](Stage& stage, std::size_t size) {
    const std::size_t history = 2 * stage.half.size() - 1;
    if (stage.input.size() < history + size) stage.input.resize(history + size);
    if (stage.middle.size() < size) stage.middle.resize(size);
    return stage.input.data() + history;
  };
  std::copy(in.begin(), in.end(), load(stages_[0], count));
  for (std::size_t s = 0; s < stages_.size(); ++s) {
    Stage& stage = stages_[s];
    const std::size_t pairs = stage.half.size();
    double* target = s + 1 < stages_.size() ? load(stages_[s + 1], 2 * count) : out.data();
    midpoints(stage.input.data(), count, stage.half, stage.middle.data());
    const double* even = stage.input.data() + pairs - 1;
    const double* odd = stage.middle.data();
    for (std::size_t i = 0; i < count; ++i) {
      target[2 * i] = even[i];
      target[2 * i + 1] = odd[i];
    }
    keep_history(stage.input, 2 * pairs - 1, count);
    count *= 2;
  }
}

Decimator::Decimator(int factor) : factor_(factor) {
  const int stages = stages_of(factor);
  for (int s = stages - 1; s >= 0; --s) {
    Stage stage;
    stage.half = halfband_midpoint_weights(1 << s);
    stage.odd.assign(2 * stage.half.size() - 1, 0.0);
    stage.even.assign(stage.half.size() - 1, 0.0);
    delay_ += (stage.half.size() - 1) * static_cast<std::size_t>(factor >> s);
    stages_.push_back(std::move(stage));
  }
}

void Decimator::process(std::span<const double> in, std::span<double> out) {
  if (in.size() != out.size() * static_cast<std::size_t>(factor_)) {
    throw std::invalid_argument("decimator: input must be factor times as long as output");
  }
  if (stages_.empty()) {
    std::copy(in.begin(), in.end(), out.begin());
    return;
  }
  const double* source = in.data();
  std::size_t count = in.size() / 2;
  for (std::size_t s = 0; s < stages_.size(); ++s, count /= 2) {
    Stage& stage = stages_[s];
    const std::size_t pairs = stage.half.size();
    const std::size_t odd_history = 2 * pairs - 1;
    if (stage.odd.size() < odd_history + count) stage.odd.resize(odd_history + count);
    if (stage.even.size() < pairs - 1 + count) stage.even.resize(pairs - 1 + count);
    if (stage.middle.size() < count) stage.middle.resize(count);
    double* even = stage.even.data() + pairs - 1;
    double* odd = stage.odd.data() + odd_history;
    for (std::size_t i = 0; i < count; ++i) {
      even[i] = source[2 * i];
      odd[i] = source[2 * i + 1];
    }
    midpoints(stage.odd.data(), count, stage.half, stage.middle.data());
    // The even sample between the two innermost odd ones of the midpoint.
    const double* centre = stage.even.data();
    double* middle = stage.middle.data();
    double* target = s + 1 < stages_.size() ? middle : out.data();
    for (std::size_t i = 0; i < count; ++i) target[i] = 0.5 * (centre[i] + middle[i]);
    keep_history(stage.even, pairs - 1, count);
    keep_history(stage.odd, odd_history, count);
    source = target;
  }
}

}  // namespace kneeprint
