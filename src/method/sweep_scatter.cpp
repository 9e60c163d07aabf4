// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/sweep_scatter.h"

#include <algorithm>
#include <array>
#include <boost/math/distributions/fisher_f.hpp>
#include <cmath>
#include <numbers>

namespace kneeprint {
namespace {

constexpr double kNodesPerOctave = 4.0;
// A window of six periods of the fundamental holds half orders apart by three of its bins; shorter
// ones than 5 ms would only have fewer values to average.
constexpr double kPeriods = 6.0;
constexpr double kShortest = 0.005;
constexpr int kNeighbours = 1;

std::vector<double> hann(std::size_t size) {
  std::vector<double> v(size);
  for (std::size_t i = 0; i < size; ++i) {
    v[i] = 0.5 - 0.5 * std::cos(2.0 * std::numbers::pi * (static_cast<double>(i) + 0.5) /
                                static_cast<double>(size));
  }
  return v;
}

// Differences of the repeats, each independent of the others and as noisy as one repeat (Helmert's
// transformation), from the last repeat backwards: the last difference holds the first repeat.
// After them: the mean.
std::vector<std::vector<double>> contrasts_and_mean(const Waveform& take, const HoldLayout& hold,
                                                    std::size_t start, std::size_t size) {
  const auto blocks = static_cast<std::size_t>(hold.blocks);
  const auto block = [&](std::size_t b) {
    return std::span(take.samples).subspan(hold.first_block + b * hold.block + start, size);
  };
  std::vector<std::vector<double>> out;
  const auto last = block(blocks - 1);
  std::vector<double> sum(last.begin(), last.end());
  for (std::size_t m = 1; m < blocks; ++m) {
    const auto next = block(blocks - 1 - m);
    const auto count = static_cast<double>(m);
    const double scale = std::sqrt(count / (count + 1.0));
    auto& c = out.emplace_back(size);
    for (std::size_t i = 0; i < size; ++i) {
      c[i] = scale * (sum[i] / count - next[i]);
      sum[i] += next[i];
    }
  }
  for (double& x : sum) x /= static_cast<double>(blocks);
  out.push_back(std::move(sum));
  return out;
}

// A row of complex numbers as two of real ones, which the compiler turns into vectors.
struct Rotor {
  std::vector<double> c, s;
};

void turn(Rotor& p, const Rotor& by) {
  for (std::size_t i = 0; i < p.c.size(); ++i) {
    const double c = p.c[i] * by.c[i] - p.s[i] * by.s[i];
    p.s[i] = p.c[i] * by.s[i] + p.s[i] * by.c[i];
    p.c[i] = c;
  }
}

double power(std::span<const double> x, const Rotor& p) {
  constexpr std::size_t kLanes = 4;
  std::array<double, kLanes> re{}, im{};
  std::size_t i = 0;
  for (; i + kLanes <= x.size(); i += kLanes) {
    for (std::size_t l = 0; l < kLanes; ++l) {
      re[l] += x[i + l] * p.c[i + l];
      im[l] += x[i + l] * p.s[i + l];
    }
  }
  for (; i < x.size(); ++i) {
    re[0] += x[i] * p.c[i];
    im[0] += x[i] * p.s[i];
  }
  const double r = re[0] + re[1] + re[2] + re[3], q = im[0] + im[1] + im[2] + im[3];
  return r * r + q * q;
}

double median(std::vector<double>& values) {
  const auto middle = values.begin() + static_cast<long>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  return *middle;
}

}  // namespace

SweepScatter::SweepScatter(const LogSweep& sweep, const Waveform& take, const HoldLayout& hold,
                           int orders, Hertz lowest, Hertz highest, Decibels wanted)
    : sweep_(sweep), rate_(take.rate), lowest_(lowest), highest_(highest), blocks_(hold.blocks) {
  const double step = std::exp2(1.0 / kNodesPerOctave);
  for (Hertz f = lowest; f < highest; f = f * step) {
    nodes_.push_back(demodulate(f, take, hold, orders));
  }
  const auto all_agree = [&] {
    for (int c = 0; c < blocks_ - 1 - first_; ++c) {
      if (!agree(c, wanted)) return false;
    }
    return true;
  };
  settled_ = all_agree();
  if (!settled_ && blocks_ > 2) {
    first_ = 1;
    settled_ = all_agree();
    if (!settled_) first_ = 0;
  }
  const int contrasts = blocks_ - 1 - first_;
  critical_.push_back(0.0);
  for (int count = 1; count <= 2 * (2 * kNeighbours + 1) * contrasts; ++count) {
    critical_.push_back(
        boost::math::quantile(boost::math::fisher_f(2.0 * contrasts, 2.0 * count), 0.999));
  }
}

SweepScatter::Node SweepScatter::demodulate(Hertz f, const Waveform& take, const HoldLayout& hold,
                                            int orders) const {
  const double rate = rate_.value();
  const Seconds length(std::max(kShortest, kPeriods / f.value()));
  const std::size_t size = std::clamp<std::size_t>(samples_in(length, rate_), 8, hold.block);
  const double middle = sweep_.time_of(f).value() * rate;
  const double latest = static_cast<double>(hold.block - size);
  const auto start =
      static_cast<std::size_t>(std::clamp(middle - static_cast<double>(size) / 2.0, 0.0, latest));

  const std::vector<double> v = hann(size);
  double sum = 0.0, squares = 0.0;
  for (const double x : v) sum += x, squares += x * x;
  std::vector<std::vector<double>> rows = contrasts_and_mean(take, hold, start, size);
  for (auto& row : rows) {
    for (std::size_t i = 0; i < size; ++i) row[i] *= v[i];
  }
  Rotor half{std::vector<double>(size), std::vector<double>(size)};
  for (std::size_t i = 0; i < size; ++i) {
    const double phase = 0.5 * sweep_.phase(Seconds(static_cast<double>(start + i) / rate));
    half.c[i] = std::cos(phase);
    half.s[i] = -std::sin(phase);
  }

  Node node;
  node.equivalent_samples = sum * sum / squares;
  const double scale = 4.0 / (sum * sum);
  const std::size_t contrasts = rows.size() - 1;
  node.powers.resize(contrasts);
  Rotor p = half;
  for (int k = 1; k <= 2 * orders + 1 && 0.5 * k * f < highest_; ++k) {
    if (k > 1) turn(p, half);
    for (std::size_t c = 0; c < contrasts; ++c) {
      node.powers[c].push_back(scale * power(rows[c], p));
    }
    if (k == 2) node.fundamental = scale * power(rows.back(), p);
  }
  return node;
}

// Medians over the sweep: a mains line, a click, a dropout touch few nodes, and widen the
// uncertainty there; a unit that has not settled changes everywhere.
bool SweepScatter::agree(int contrast, Decibels wanted) const {
  std::vector<double> on, off;
  for (const Node& node : nodes_) {
    if (!(node.fundamental > 0.0)) continue;
    const auto& p = node.powers[static_cast<std::size_t>(contrast)];
    for (const std::size_t k : {1, 2, 3}) {
      if (k <= p.size()) (k == 2 ? on : off).push_back(p[k - 1] / node.fundamental);
    }
  }
  if (on.empty() || off.empty()) return true;
  // |Z|^2 of noise is exponential; the median of n such values scatters by 1 / (ln 2 sqrt n), here
  // by some 30 % for both together. Noise alone passes 2.5 in about one take of a thousand.
  constexpr double kSignificant = 2.5;
  const double shown = median(on), noise = median(off);
  if (shown <= kSignificant * noise) return true;
  constexpr double kDbPerRelative = 8.685889638065036;  // 20 / ln 10
  return kDbPerRelative * std::sqrt(shown - noise) <= wanted.value();
}

Contribution SweepScatter::u(int order, Hertz f, Seconds window_energy) const {
  const int kept = blocks_ - first_, contrasts = kept - 1;
  const auto nodes = static_cast<int>(nodes_.size());
  if (contrasts < 1 || nodes == 0) return {};
  const int nearest = std::clamp(
      static_cast<int>(std::lround(kNodesPerOctave * std::log2(f / lowest_))), 0, nodes - 1);
  // As the variance of white noise that would show the same.
  const auto variance = [&](const Node& node, int contrast, int half_order) {
    return node.powers[static_cast<std::size_t>(contrast)]
                      [static_cast<std::size_t>(half_order - 1)] *
           node.equivalent_samples / 4.0;
  };
  const auto has = [&](const Node& node, int half_order) {
    return half_order <= static_cast<int>(node.powers.front().size());
  };
  double off = 0.0, on = 0.0, own_power = 0.0;
  int off_count = 0, on_count = 0;
  for (int i = std::max(0, nearest - kNeighbours); i <= std::min(nodes - 1, nearest + kNeighbours);
       ++i) {
    const Node& node = nodes_[static_cast<std::size_t>(i)];
    for (int c = 0; c < contrasts; ++c) {
      for (const int k : {2 * order - 1, 2 * order + 1}) {
        if (!has(node, k)) continue;
        off += variance(node, c, k);
        ++off_count;
      }
      if (i != nearest || !has(node, 2 * order)) continue;
      on += variance(node, c, 2 * order);
      own_power +=
          node.powers[static_cast<std::size_t>(c)][static_cast<std::size_t>(2 * order - 1)];
      ++on_count;
    }
  }
  if (off_count + on_count == 0) return {};
  const bool drifts =
      off_count > 0 && on_count > 0 &&
      on / on_count > critical_[static_cast<std::size_t>(off_count)] * off / off_count;
  if (drifts) return {std::sqrt(0.5 * own_power / on_count / kept), 2.0 * on_count};
  // A white noise of variance s, through the inverse spectrum 4 F / (L rate^2) and the window, is
  // 4 F E s / (L rate) of complex variance in one repeat.
  const double s = (on + off) / (on_count + off_count);
  const double through =
      2.0 * order * f.value() * window_energy.value() / (sweep_.growth().value() * rate_.value());
  return {std::sqrt(through * s / kept), 2.0 * (on_count + off_count)};
}

}  // namespace kneeprint
