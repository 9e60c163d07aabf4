// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/dim_recording.h"

#include <fmt/format.h>

#include <algorithm>
#include <boost/math/distributions/fisher_f.hpp>
#include <cmath>
#include <complex>
#include <numbers>
#include <span>

#include "method/dim_signal.h"
#include "quantity/failure.h"
#include "signal/fft.h"
#include "signal/window.h"

namespace kneeprint {
namespace {

constexpr double kLowestRate = 44100.0;
constexpr Seconds kBlock{0.5};
constexpr Seconds kChunk{0.02};   // in which the level is judged
constexpr Seconds kMargin{0.05};  // left out at either end of the steady part
constexpr int kLeastBlocks = 4;
constexpr int kMostBlocks = 120;
constexpr double kSearch = 0.02;      // generators are tuned better than that; H5 is 5 % away
constexpr double kLeastShare = 0.02;  // of the strongest line: the sine has 0.2 of it
constexpr double kSteadyDb = 0.5;     // a unit that still settles more than this is cut off
constexpr double kDegreesOfTwo = 2.0;

struct Part {
  std::size_t start = 0, length = 0;
};

// The longest run of chunks whose level keeps within kSteadyDb of their median; the median is over
// chunks within 20 dB of the loudest, so that silence does not count.
Part steady_part(const Waveform& x) {
  const std::size_t chunk = samples_in(kChunk, x.rate);
  std::vector<double> db;
  for (std::size_t n = 0; n + chunk <= x.samples.size(); n += chunk) {
    double sum = 0.0;
    for (std::size_t i = n; i < n + chunk; ++i) sum += x.samples[i] * x.samples[i];
    db.push_back(10.0 * std::log10(std::max(sum / static_cast<double>(chunk), 1e-30)));
  }
  if (db.empty()) return {};
  const double loudest = *std::max_element(db.begin(), db.end());
  std::vector<double> sounding;
  std::copy_if(db.begin(), db.end(), std::back_inserter(sounding),
               [&](double d) { return d > loudest - 20.0; });
  const auto middle = sounding.begin() + static_cast<long>(sounding.size() / 2);
  std::nth_element(sounding.begin(), middle, sounding.end());
  std::size_t best_start = 0, best = 0, run = 0;
  for (std::size_t i = 0; i < db.size(); ++i) {
    run = std::abs(db[i] - *middle) <= kSteadyDb ? run + 1 : 0;
    if (run > best) {
      best = run;
      best_start = i + 1 - run;
    }
  }
  const std::size_t margin = samples_in(kMargin, x.rate);
  if (best * chunk <= 2 * margin) return {};
  return {best_start * chunk + margin, best * chunk - 2 * margin};
}

// One block under the window, times counted from its middle in samples.
class WindowedBlock {
 public:
  WindowedBlock(std::span<const double> x, std::span<const double> window, Hertz rate)
      : x_(x), window_(window), rate_(rate) {
    for (std::size_t n = 0; n < x.size(); ++n) {
      sum_ += window[n];
      spread_ += window[n] * time(n) * time(n);
    }
    spread_ /= sum_;
  }

  /// Peak amplitude and phase (cosine, at the middle) of a tone at `f`.
  std::complex<double> line(double f) const { return moments(f).first * (2.0 / sum_); }

  /// The tone's own frequency from a guess within the main lobe.
  double refined(double f) const {
    for (int i = 0; i < 20; ++i) {
      const auto [zeroth, first] = moments(f);
      if (std::abs(zeroth) <= 0.0) break;
      const double step =
          (first / zeroth).imag() / spread_ * rate_.value() / (2.0 * std::numbers::pi);
      f += step;
      if (std::abs(step) < 1e-13 * f) break;
    }
    return f;
  }

 private:
  double time(std::size_t n) const {
    return static_cast<double>(n) - 0.5 * static_cast<double>(x_.size());
  }
  // sum w x e^-jwn and sum n w x e^-jwn.
  std::pair<std::complex<double>, std::complex<double>> moments(double f) const {
    const double w = 2.0 * std::numbers::pi * f / rate_.value();
    const std::complex<double> step = std::polar(1.0, -w);
    std::complex<double> turn, zeroth = 0.0, first = 0.0;
    for (std::size_t n = 0; n < x_.size(); ++n) {
      constexpr std::size_t kAfresh = 512;  // rounding of the product does not build up
      turn = n % kAfresh == 0 ? std::polar(1.0, -w * time(n)) : turn * step;
      const std::complex<double> z = window_[n] * x_[n] * turn;
      zeroth += z;
      first += time(n) * z;
    }
    return {zeroth, first};
  }

  std::span<const double> x_, window_;
  Hertz rate_;
  double sum_ = 0.0, spread_ = 0.0;
};

// The strongest line within kSearch of `nominal`; 0 when none stands clear of the noise.
double strongest(const std::vector<std::complex<double>>& spectrum, double width, Hertz nominal) {
  constexpr double kClear = 10.0;  // 20 dB over the median of the range
  const auto low = static_cast<std::size_t>(nominal.value() * (1.0 - kSearch) / width);
  const auto high = static_cast<std::size_t>(nominal.value() * (1.0 + kSearch) / width);
  std::vector<double> magnitudes;
  std::size_t best = low;
  for (std::size_t k = low; k <= high; ++k) {
    magnitudes.push_back(std::abs(spectrum[k]));
    if (magnitudes.back() > std::abs(spectrum[best])) best = k;
  }
  const double peak = std::abs(spectrum[best]);
  double largest = 0.0;
  for (const auto& z : spectrum) largest = std::max(largest, std::abs(z));
  const auto middle = magnitudes.begin() + static_cast<long>(magnitudes.size() / 2);
  std::nth_element(magnitudes.begin(), middle, magnitudes.end());
  const bool at_edge = best == low || best == high;
  return peak > kClear * *middle && peak > kLeastShare * largest && !at_edge
             ? static_cast<double>(best) * width
             : 0.0;
}

// A quantity of each block as mean with the standard uncertainty of the mean.
Uncertain mean_of(const std::vector<double>& values) {
  const auto n = static_cast<double>(values.size());
  double sum = 0.0, squares = 0.0;
  for (const double v : values) sum += v;
  for (const double v : values) squares += (v - sum / n) * (v - sum / n);
  return {sum / n, std::sqrt(squares / (n - 1.0) / n), n - 1.0};
}

// Mean of a line over blocks. `beside`: the noise next to it, one value per probe and block.
Line mean_line(const std::vector<std::complex<double>>& blocks,
               const std::vector<std::complex<double>>& beside) {
  const auto n = static_cast<double>(blocks.size());
  std::complex<double> mean = 0.0;
  for (const auto& z : blocks) mean += z / n;
  double scatter = 0.0, noise = 0.0;
  for (const auto& z : blocks) scatter += std::norm(z - mean);
  for (const auto& z : beside) noise += std::norm(z);
  const double scatter_dof = kDegreesOfTwo * (n - 1.0);
  const double noise_dof = kDegreesOfTwo * static_cast<double>(beside.size());
  double variance = scatter / scatter_dof, dof = scatter_dof;
  if (noise > 0.0) {
    const double of_noise = noise / noise_dof;
    // As in BlockSpectra::mean: pooled unless the blocks scatter more than the noise explains.
    const double most = boost::math::quantile(boost::math::fisher_f(scatter_dof, noise_dof), 0.99);
    if (variance <= most * of_noise) {
      variance = (scatter + noise) / (scatter_dof + noise_dof);
      dof = scatter_dof + noise_dof;
    }
  }
  return {mean, std::sqrt(variance / n), dof};
}

}  // namespace

std::string_view name(DimKind kind) { return kind == DimKind::dim30 ? "dim-30" : "dim-100"; }

std::optional<DimKind> dim_kind_named(std::string_view text) {
  for (const DimKind kind : {DimKind::dim30, DimKind::dim100}) {
    if (name(kind) == text) return kind;
  }
  return std::nullopt;
}

DimReading read_dim(const Waveform& recording, DimKind kind, const std::string& origin) {
  const Hertz rate = recording.rate;
  if (rate.value() < kLowestRate) {
    throw InputError(
        fmt::format("{}: recorded at {} Hz; expected at least {} Hz, so that 15 kHz is "
                    "whole",
                    origin, rate.value(), kLowestRate));
  }
  const std::size_t block = samples_in(kBlock, rate);
  const Part part = steady_part(recording);
  const auto blocks = static_cast<int>(std::min<std::size_t>(part.length / block, kMostBlocks));
  if (blocks < kLeastBlocks) {
    throw InputError(fmt::format(
        "{}: {:.2f} s of steady signal; expected at least {:.1f} s at one level", origin,
        static_cast<double>(part.length) / rate.value(), kLeastBlocks * kBlock.value()));
  }

  const std::vector<double> window = sample(kneeprint::window("albrecht-7"), block);
  const auto block_at = [&](int b) {
    return std::span(recording.samples)
        .subspan(part.start + block * static_cast<std::size_t>(b), block);
  };
  std::vector<double> shaped(block_at(0).begin(), block_at(0).end());
  for (std::size_t n = 0; n < block; ++n) shaped[n] *= window[n];
  const double width = rate.value() / static_cast<double>(block);
  const auto spectrum = forward_fft(shaped);
  double square = strongest(spectrum, width, kDimSquare);
  double sine = strongest(spectrum, width, kDimSine);
  for (const auto& [found, wanted, what] :
       {std::tuple(square, kDimSquare, "square"), std::tuple(sine, kDimSine, "sine")}) {
    if (found <= 0.0) {
      throw InputError(
          fmt::format("{}: no {} clear of the noise within {:g} % of {} Hz; expected "
                      "the recording of a DIM generator",
                      origin, what, 100.0 * kSearch, wanted.value()));
    }
  }

  DimReading out;
  out.kind = kind;
  out.blocks = blocks;
  out.start = Seconds(static_cast<double>(part.start) / rate.value());
  out.length = blocks * kBlock;
  out.clipped = reaches_full_scale(recording, {part.start, block, blocks});
  const Hertz pole = kind == DimKind::dim30 ? kDim30Pole : kDim100Pole;
  out.nominal_over_sine = kDimRatio * std::abs(square_harmonic(1, kDimSquare, pole));

  std::vector<double> squares_hz, sines_hz, over_sine, sines;
  std::array<std::vector<std::complex<double>>, 9> lines, beside;
  const auto products = dim_products();
  for (int b = 0; b < blocks; ++b) {
    const WindowedBlock windowed(block_at(b), window, rate);
    square = windowed.refined(square);
    sine = windowed.refined(sine);
    squares_hz.push_back(square);
    sines_hz.push_back(sine);
    const std::complex<double> f1 = windowed.line(square), f2 = windowed.line(sine);
    over_sine.push_back(std::abs(f1) / std::abs(f2));
    sines.push_back(std::abs(f2));
    for (std::size_t i = 0; i < products.size(); ++i) {
      const ProductIndex p = products[i];
      const double f = p.k1 * square + p.k2 * sine;
      const double turn = p.k1 * std::arg(f1) + p.k2 * std::arg(f2);
      lines[i].push_back(windowed.line(f) * std::polar(1.0, -turn));
      // Outside the window's main lobe, far enough apart to be independent, clear of other lines.
      for (const double bins : {10.0, 14.0, 18.0, 22.0}) {
        for (const double side : {-1.0, 1.0}) {
          beside[i].push_back(windowed.line(f + side * bins * width));
        }
      }
    }
  }
  out.square_hz = mean_of(squares_hz);
  out.sine_hz = mean_of(sines_hz);
  out.square_over_sine = mean_of(over_sine);
  const Uncertain sine_amplitude = mean_of(sines);
  const Line reference{sine_amplitude.value, sine_amplitude.u, sine_amplitude.dof};

  std::vector<Line> read;
  std::vector<RelativeReading> readings;
  for (std::size_t i = 0; i < products.size(); ++i) {
    DimProduct& p = out.products[i];
    p.k = static_cast<int>(i) + 1;
    p.frequency = Hertz(products[i].k1 * out.square_hz.value + products[i].k2 * out.sine_hz.value);
    const Line l = mean_line(lines[i], beside[i]);
    p.over_sine = relate(std::abs(l.mean), l.u, l.dof, reference, 0.0);
    read.push_back(l);
    readings.push_back(p.over_sine);
  }
  out.figure = dim_figure(read, readings, reference);
  return out;
}

std::vector<ScalarPoint> scalars_of(const DimReading& reading) {
  std::vector<ScalarPoint> rows;
  const auto row = [&](std::string figure, std::string state, Cell value, std::string unit,
                       Cell expanded) -> ScalarPoint& {
    ScalarPoint s;
    s.method = name(reading.kind);
    s.figure = std::move(figure);
    s.state = std::move(state);
    s.value = value;
    s.value_unit = std::move(unit);
    s.expanded_u = expanded;
    if (reading.clipped) s.flag = Flag::clipped;
    return rows.emplace_back(std::move(s));
  };
  const auto flagged = [&](ScalarPoint& s, Flag flag) {
    const std::array flags{s.flag, flag};
    s.flag = gravest(flags);
  };
  const RelativeReading& all = reading.figure;
  if (all.ratio > 0.0) {
    flagged(row("dim", "-", 100.0 * all.ratio, "%", 100.0 * coverage_factor_95(all.dof) * all.u),
            all.flag);
  }
  for (const DimProduct& p : reading.products) {
    const RelativeReading& r = p.over_sine;
    Cell value, expanded;
    if (r.ratio > 0.0) {
      value = 20.0 * std::log10(r.ratio);
      expanded = kDbPerRelative * coverage_factor_95(r.dof) * r.u / r.ratio;
    }
    ScalarPoint& s = row("product", fmt::format("k{}", p.k), value, "dB", expanded);
    s.frequency_hz = p.frequency.value();
    flagged(s, r.flag);
  }
  row("square", "-", reading.square_hz.value, "Hz", expanded_95(reading.square_hz));
  row("sine", "-", reading.sine_hz.value, "Hz", expanded_95(reading.sine_hz));
  const Uncertain& over = reading.square_over_sine;
  row("square-over-sine", "-", 20.0 * std::log10(over.value), "dB",
      kDbPerRelative * expanded_95(over) / over.value);
  row("square-over-sine", "nominal", 20.0 * std::log10(reading.nominal_over_sine), "dB",
      std::nullopt);
  return rows;
}

}  // namespace kneeprint
