// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/time_base.h"

#include <algorithm>
#include <array>
#include <boost/math/distributions/fisher_f.hpp>
#include <cmath>
#include <complex>
#include <numbers>
#include <numeric>
#include <vector>

#include "method/products.h"
#include "signal/fft.h"
#include "signal/resample.h"
#include "signal/uniform_spline.h"

namespace kneeprint {
namespace {

constexpr double kTurn = 2.0 * std::numbers::pi;
constexpr Seconds kAround{0.005};    // read in stimulus' time beyond the hold's ends
constexpr Seconds kFarthest{0.008};  // excursion that still reads steady tones
constexpr Seconds kKnots{0.016};
constexpr double kPeriodsPerKnot = 0.75;
constexpr Seconds kShortestLook{0.010};
constexpr double kPeriodsPerLook = 4.0;
constexpr int kLooksPerLength = 4;  // overlap of the first, coarse looks
constexpr double kSmall = 1e-3;     // samples: 1e-5 of amplitude at 20 kHz and 48 kHz
constexpr double kFarToStep = 0.5;  // rad: Gauss and Newton's steps converge from there
constexpr int kMostPasses = 8;
constexpr double kLineOverNoise = 5.0;  // noise alone passes in 4 of 10^6
// rad^2 of the tracker's own noise: beyond, a phase slips whole turns, and noise alone is drawn
// into a tone (common practice for phase-locked loops).
constexpr double kMostPhaseNoise = 0.1;
constexpr std::size_t kHighestHarmonic = 20;
constexpr int kHighestProduct = 5;
constexpr Hertz kSidebands{500.0};  // how far from the tone jitter is looked for
constexpr Hertz kSlowestFlutter{0.5}, kFastestFlutter{10.0};

// e in samples: the sample m of the stimulus stands at m - e(m) in the response.
class Follower {
 public:
  Follower(const Waveform& response, const HoldLayout& hold, std::span<const std::size_t> tones)
      : response_(response), hold_(hold), rate_(response.rate) {
    for (const std::size_t tone : tones) stride_ = std::gcd(stride_, tone);
    const auto around = static_cast<long>(samples_in(kAround, rate_));
    begin_ = std::max(0L, static_cast<long>(hold.first_block) - around);
    end_ = std::min(static_cast<long>(response.samples.size()),
                    static_cast<long>(hold.end()) + around);
    look_from_afar(tones);
    find_lines(tones);
  }

  SteadiedTake run() {
    SteadiedTake out;
    if (lead_ == 0 || hold_.blocks < 1 || end_ <= begin_) return out;
    const double period_s = seconds(static_cast<double>(hold_.block)) / static_cast<double>(lead_);
    const double knots = std::max(kKnots.value(), kPeriodsPerKnot * period_s) * rate_.value();
    const double length = static_cast<double>(end_ - begin_);
    UniformSpline e(static_cast<double>(begin_), static_cast<double>(end_),
                    static_cast<std::size_t>(std::max(1.0, std::round(length / knots))));
    const UniformSpline zero = e;
    start(e);
    if (too_far(e)) return left_alone(e, 0.0);
    const auto emptied =
        static_cast<std::size_t>(std::ceil(0.6 / knots * static_cast<double>(hold_.block)));

    Waveform steadied = response_;
    std::optional<SplineFit> fit;
    std::optional<BlockSpectra> spectra;
    // What turns the tone by less is found from no correction at all.
    if (e.extent() * radians_per_sample(lead_) < kFarToStep) e = zero;
    UniformSpline best = e;
    for (int pass = 0; pass < kMostPasses; ++pass) {
      e = best;
      if (pass > 0 || is_moved(e)) read_again(steadied, e);
      spectra.emplace(steadied, hold_, stride_, emptied);
      fit.emplace(e);
      refine(*fit, *spectra, steadied);
      UniformSpline step = zero;
      step.coefficients() = fit->solve();
      for (std::size_t k = 0; k < e.size(); ++k) best.coefficients()[k] += step.coefficients()[k];
      if (too_far(best)) return left_alone(best, 0.0);
      if (!is_moved(step)) break;
    }
    const BlockSpectra::Noise noise = spectra->noise_around(lead_, 0);
    // One component of a bin is the mean of block/2 samples' noise: sigma_bin^2 = 2 sigma^2 /
    // block.
    const double variance = 0.5 * static_cast<double>(hold_.block) * noise.sigma * noise.sigma;
    const double excess = excess_variance(*spectra, emptied);
    if (!is_moved(best)) return left_alone(best, excess);
    // Mean of B(m)' (G'G)^-1 B(m) sigma^2 over the hold: K sigma^2 / sum of g^2, g being
    // stationary.
    const double own = static_cast<double>(e.size()) * variance / fit->weight();
    const double slip = own * radians_per_sample(lead_) * radians_per_sample(lead_);
    if (slip > kMostPhaseNoise || !is_significant(*fit, best, variance, noise.dof)) {
      return left_alone(best, excess);
    }

    out.time.jitter = Seconds(std::sqrt(seconds(seconds(own)) + excess));
    out.time.drifts = true;
    out.time.speed = (e.value(e.to()) - e.value(e.from())) / length;
    out.time.flutter = flutter(e);
    out.take = std::move(steadied);
    out.emptied = emptied;
    return out;
  }

 private:
  double seconds(double samples) const { return samples / rate_.value(); }
  double radians_per_sample(std::size_t bin) const {
    return kTurn * static_cast<double>(bin) / static_cast<double>(hold_.block);
  }

  // DC, the harmonics of one tone, the products of two, the tones alone of more. Not every multiple
  // of what the tones share: flutter that turns whole cycles in a block is none of theirs.
  void find_lines(std::span<const std::size_t> tones) {
    lines_.assign(tones.begin(), tones.end());
    lines_.push_back(0);
    if (tones.size() == 1) {
      for (std::size_t order = 2; order <= kHighestHarmonic; ++order) {
        lines_.push_back(order * tones[0]);
      }
    } else if (tones.size() == 2) {
      for (const ProductIndex p : products_to_order(kHighestProduct, tones[0], tones[1])) {
        lines_.push_back(static_cast<std::size_t>(
            std::abs(p.k1 * static_cast<long>(tones[0]) + p.k2 * static_cast<long>(tones[1]))));
      }
    }
    add_mains();
    std::ranges::sort(lines_);
    lines_.erase(std::unique(lines_.begin(), lines_.end()), lines_.end());
    std::erase_if(lines_, [&](std::size_t k) { return 2 * k >= hold_.block; });
  }

  // Hum near a low tone turns its phase (and its amplitude) as flutter would: 50 Hz by 41 Hz looks
  // like 9 Hz. It stands on one side of the tone, flutter on both, so flutter is still followed.
  // Where the other side may be hum as well (50 and 60 Hz by 55 Hz), nothing tells them apart.
  void add_mains() {
    constexpr double kHighestHum = 300.0;
    const double width = rate_.value() / static_cast<double>(hold_.block);
    const auto is_hum = [&](double f) {
      const auto on = [f](double mains) { return std::abs(std::remainder(f, mains)) < 1e-6; };
      return f > 0.0 && f <= kHighestHum && (on(50.0) || on(60.0));
    };
    const auto last = static_cast<std::size_t>(kHighestHum / width + 1e-9);
    for (std::size_t bin = 1; bin <= last; ++bin) {
      const double f = width * static_cast<double>(bin);
      const double mirror = 2.0 * width * static_cast<double>(lead_) - f;
      if (is_hum(f) && !is_hum(mirror)) lines_.push_back(bin);
    }
  }
  bool is_line(std::size_t bin) const { return std::ranges::binary_search(lines_, bin); }

  // Phase of each tone in short looks, unwrapped from look to look: e where the tone tells it
  // best, which is where amplitude times frequency is greatest.
  void look_from_afar(std::span<const std::size_t> tones) {
    double best = 0.0;
    for (const std::size_t tone : tones) {
      if (tone == 0) continue;
      const double period = static_cast<double>(hold_.block) / static_cast<double>(tone);
      const auto length =
          static_cast<long>(std::max(cycles(rate_, kShortestLook), kPeriodsPerLook * period));
      const long hop = std::max(1L, length / kLooksPerLength);
      const std::vector<std::complex<double>> looks = looks_at(tone, length, hop);
      double weight = 0.0;
      for (const auto& z : looks) weight += std::norm(z);
      weight *=
          static_cast<double>(tone * tone) / static_cast<double>(looks.size() * length * length);
      if (!(weight > best)) continue;
      best = weight;
      lead_ = tone;
      hop_ = hop;
      coarse_.assign(1, 0.0);
      for (std::size_t i = 1; i < looks.size(); ++i) {
        coarse_.push_back(coarse_.back() +
                          std::arg(looks[i] * std::conj(looks[i - 1])) / radians_per_sample(tone));
      }
    }
  }

  std::vector<std::complex<double>> looks_at(std::size_t tone, long length, long hop) const {
    std::vector<std::complex<double>> carrier(hold_.block);
    for (std::size_t n = 0; n < hold_.block; ++n) {
      const std::size_t cycles = tone * n % hold_.block;
      carrier[n] = std::polar(1.0, -radians_per_sample(cycles));
    }
    std::vector<double> window(static_cast<std::size_t>(length));  // Hann
    for (std::size_t n = 0; n < window.size(); ++n) {
      window[n] = 0.5 - 0.5 * std::cos(kTurn * (static_cast<double>(n) + 0.5) /
                                       static_cast<double>(length));
    }
    const auto size = static_cast<long>(response_.samples.size());
    const auto block = static_cast<long>(hold_.block);
    std::vector<std::complex<double>> out;
    for (long centre = begin_; centre < end_ + hop; centre += hop) {
      const long first = centre - length / 2;
      std::complex<double> sum = 0.0;
      for (long k = std::max(0L, -first); k < length && first + k < size; ++k) {
        const long n = first + k;
        const long in_block = ((n - static_cast<long>(hold_.first_block)) % block + block) % block;
        sum += window[static_cast<std::size_t>(k)] *
               response_.samples[static_cast<std::size_t>(n)] *
               carrier[static_cast<std::size_t>(in_block)];
      }
      out.push_back(sum);
    }
    return out;
  }

  // The coarse looks as a spline of mean 0: where the take stands as a whole is not the tone's to
  // say.
  void start(UniformSpline& e) const {
    std::vector<double> values;
    for (std::size_t k = 0; k < e.size(); ++k) {
      const double position =
          (e.centre(k) - static_cast<double>(begin_)) / static_cast<double>(hop_);
      const auto i = static_cast<std::size_t>(
          std::clamp(std::floor(position), 0.0, static_cast<double>(coarse_.size()) - 2.0));
      const double part = position - static_cast<double>(i);
      values.push_back(coarse_[i] + part * (coarse_[i + 1] - coarse_[i]));
    }
    const double mean =
        std::accumulate(values.begin(), values.end(), 0.0) / static_cast<double>(values.size());
    for (double& v : values) v -= mean;
    e.follow(values);
  }

  static bool is_moved(const UniformSpline& e) { return e.extent() > kSmall; }
  bool too_far(const UniformSpline& e) const {
    return !(seconds(0.5 * e.extent()) < kFarthest.value());
  }

  void read_again(Waveform& out, const UniformSpline& e) const {
    std::vector<double> positions;
    positions.reserve(static_cast<std::size_t>(end_ - begin_));
    for (long m = begin_; m < end_; ++m) {
      positions.push_back(static_cast<double>(m) - e.value(static_cast<double>(m)));
    }
    std::ranges::copy(read_at(response_.samples, positions), out.samples.begin() + begin_);
  }

  // The lines that the tones can cause and that stand clear of the noise, as one periodic block
  // and its slope; what the take has beyond them tells how far its time is off still.
  void refine(SplineFit& fit, const BlockSpectra& spectra, const Waveform& take) const {
    std::vector<std::complex<double>> line(spectra.bins()), slope(spectra.bins());
    const double to_fft = 0.5 * static_cast<double>(hold_.block);
    const double averaged = std::sqrt(static_cast<double>(spectra.blocks()));
    for (const std::size_t k : lines_) {
      std::complex<double> mean = 0.0;
      for (int b = 0; b < spectra.blocks(); ++b) mean += spectra.at(b, k);
      mean /= static_cast<double>(spectra.blocks());
      const double noise = spectra.noise_around(k, 0).sigma / averaged;
      if (k != lead_ && std::abs(mean) <= kLineOverNoise * noise) continue;
      line[k] = mean * (k == 0 ? 2.0 * to_fft : to_fft);
      slope[k] = line[k] * std::complex<double>(0.0, radians_per_sample(k));
    }
    const std::vector<double> expected = inverse_fft(line, hold_.block);
    const std::vector<double> rise = inverse_fft(slope, hold_.block);
    const auto block = static_cast<long>(hold_.block);
    for (long m = begin_; m < end_; ++m) {
      const auto n = static_cast<std::size_t>(
          ((m - static_cast<long>(hold_.first_block)) % block + block) % block);
      fit.add(static_cast<double>(m), rise[n],
              take.samples[static_cast<std::size_t>(m)] - expected[n]);
    }
  }

  // Would noise alone draw such a curve in more than 0.1 % of takes?
  static bool is_significant(const SplineFit& fit, const UniformSpline& e, double variance,
                             double noise_dof) {
    if (!(variance > 0.0) || !(noise_dof > 0.0)) return true;
    const double freedom = static_cast<double>(e.size()) - 1.0;
    const double limit = boost::math::quantile(boost::math::fisher_f(freedom, noise_dof), 0.999);
    return fit.departure(e.coefficients()) > limit * freedom * variance;
  }

  // Phase modulation of the leading tone beyond its amplitude modulation, as a variance of time in
  // s^2. With U and L the sidebands at +-k turned by the tone's phase, |U - conj L| / A is the
  // index of phase modulation, |U + conj L| / A that of amplitude modulation; noise gives both
  // alike. Where the tracker emptied the phase's side the rest is judged apart, so that it hides
  // nothing.
  double excess_variance(const BlockSpectra& spectra, std::size_t emptied) const {
    const auto widest = static_cast<std::size_t>(kSidebands.value() / spectra.bin_width());
    const std::size_t last = std::min({widest, lead_ - 1, spectra.bins() - 2 - lead_});
    double within = 0.0, beyond = 0.0;
    for (int b = 0; b < spectra.blocks(); ++b) {
      const std::complex<double> tone = spectra.at(b, lead_);
      if (!(std::abs(tone) > 0.0)) return 0.0;
      for (std::size_t k = 1; k <= last; ++k) {
        if (is_line(lead_ + k) || is_line(lead_ - k)) continue;
        const std::complex<double> upper = spectra.at(b, lead_ + k) / tone,
                                   lower = std::conj(spectra.at(b, lead_ - k) / tone);
        (k <= emptied ? within : beyond) +=
            0.5 * (std::norm(upper - lower) - std::norm(upper + lower));
      }
    }
    const double radians = kTurn * static_cast<double>(lead_) * spectra.bin_width();
    return (std::max(0.0, within) + std::max(0.0, beyond)) / spectra.blocks() / (radians * radians);
  }

  SteadiedTake left_alone(const UniformSpline& e, double excess) const {
    double sum = 0.0, squares = 0.0;
    const auto count = static_cast<double>(end_ - begin_);
    for (long m = begin_; m < end_; ++m) {
      const double v = e.value(static_cast<double>(m));
      sum += v;
      squares += v * v;
    }
    const double variance = std::max(0.0, squares / count - (sum / count) * (sum / count));
    SteadiedTake out;
    out.time.jitter = Seconds(std::sqrt(seconds(seconds(variance)) + excess));
    return out;
  }

  // The largest deviation of the speed: of its cosine series (which sees no jump from one end to
  // the other) the terms in the band, fading out over an octave below and half of one above. What
  // the missing rest of the series leaves at the very ends is left out.
  double flutter(const UniformSpline& e) const {
    constexpr Hertz kGrid{200.0};
    constexpr Seconds kEnds{0.1};
    const double length_s = seconds(e.to() - e.from());
    const auto count = static_cast<std::size_t>(cycles(kGrid, Seconds(length_s)));
    const auto ends = static_cast<std::size_t>(cycles(kGrid, kEnds));
    if (count < 4 * ends) return 0.0;
    std::vector<double> speed(count), deviation(count, 0.0);
    for (std::size_t i = 0; i < count; ++i) {
      speed[i] = e.slope(e.from() + (static_cast<double>(i) + 0.5) / static_cast<double>(count) *
                                        (e.to() - e.from()));
    }
    for (std::size_t k = 1; k < count; ++k) {
      const double f = static_cast<double>(k) / (2.0 * length_s);
      const double share = std::min(2.0 * f / kSlowestFlutter.value() - 1.0,
                                    3.0 - 2.0 * f / kFastestFlutter.value());
      if (share <= 0.0) continue;
      const auto term = [&](std::size_t i) {
        return std::cos(std::numbers::pi * static_cast<double>(k) * (static_cast<double>(i) + 0.5) /
                        static_cast<double>(count));
      };
      double weight = 0.0;
      for (std::size_t i = 0; i < count; ++i) weight += speed[i] * term(i);
      weight *= 2.0 / static_cast<double>(count) * std::min(1.0, share);
      for (std::size_t i = 0; i < count; ++i) deviation[i] += weight * term(i);
    }
    double peak = 0.0;
    for (std::size_t i = ends; i + ends < count; ++i) peak = std::max(peak, std::abs(deviation[i]));
    return peak;
  }

  const Waveform& response_;
  const HoldLayout& hold_;
  Hertz rate_;
  std::size_t stride_ = 0;
  std::vector<std::size_t> lines_;  // bins, ascending
  long begin_ = 0, end_ = 0;
  std::size_t lead_ = 0;  // cycles per block of the tone that tells time best; 0: none does
  long hop_ = 1;
  std::vector<double> coarse_;  // e less a constant, every hop_ samples from begin_
};

}  // namespace

double RecorderTime::loss(Hertz f) const {
  const double x = kTurn * cycles(f, jitter);
  return -std::expm1(-0.5 * x * x);
}

Line RecorderTime::with_loss(const Line& line, Hertz f) const {
  const double lost = loss(f);
  if (lost == 0.0) return line;
  const std::array parts{Contribution{line.u, line.dof},
                         Contribution{std::abs(line.mean) * lost, kInfiniteDof}};
  const Contribution both = combine(parts);
  return {line.mean, both.u, both.dof};
}

SteadiedTake steady_time(const Waveform& response, const HoldLayout& hold,
                         std::span<const std::size_t> tones) {
  return Follower(response, hold, tones).run();
}

std::vector<std::size_t> steady_tones(const Stimulus& stimulus) {
  constexpr double kWeak = 0.01;
  if (stimulus.hold.blocks < 2) return {};
  const auto spectrum = forward_fft(
      std::span(stimulus.wave.samples).subspan(stimulus.hold.first_block, stimulus.hold.block));
  double strongest = 0.0;
  for (const auto& z : spectrum) strongest = std::max(strongest, std::abs(z));
  std::vector<std::size_t> tones;
  for (std::size_t k = 1; k < spectrum.size(); ++k) {
    if (std::abs(spectrum[k]) > kWeak * strongest) tones.push_back(k);
    if (tones.size() > 2) return {};
  }
  return tones;
}

SteadiedTake in_stimulus_time(const Waveform& response, const HoldLayout& hold,
                              std::span<const std::size_t> tones, const RigView& rig) {
  return rig.drifting_clock ? steady_time(response, hold, tones) : SteadiedTake{};
}

}  // namespace kneeprint
