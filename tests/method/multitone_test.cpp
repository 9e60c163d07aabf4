// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/multitone.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <array>
#include <boost/math/distributions/binomial.hpp>
#include <cmath>
#include <complex>
#include <map>
#include <numbers>

#include "method/synthetic.h"
#include "signal/fft.h"
#include "signal/hearing.h"
#include "signal/multitone_design.h"

using namespace kneeprint;
using kneeprint::testing::read;
using kneeprint::testing::response;
using kneeprint::testing::spec_for;

namespace {

double wire(double x) { return x; }

const ScalarPoint& figure(const Curves& c, const std::string& id) {
  for (const ScalarPoint& p : c.scalars) {
    if (p.figure == id) return p;
  }
  throw std::out_of_range(id);
}

std::vector<TracePoint> trace(const Curves& c, const std::string& id) {
  std::vector<TracePoint> out;
  std::ranges::copy_if(c.traces, std::back_inserter(out),
                       [&](const TracePoint& p) { return p.trace == id; });
  return out;
}

bool on_mains(std::size_t k) { return k <= 1000 && (k % 50 == 0 || k % 60 == 0); }

// Mean square in band of the square of a multitone of peak 1, from the list of tones.
struct SquarePowers {
  double even = 0.0, mains = 0.0;
};
SquarePowers square_powers() {
  const auto& tones = multitone_tones();
  double sum = 0.0;
  for (const MultitoneTone& t : tones) sum += std::cos(t.phase);
  const double a = 1.0 / sum;
  std::map<std::size_t, std::complex<double>> lines;
  for (std::size_t i = 0; i < tones.size(); ++i) {
    lines[2 * tones[i].cycles] += std::polar(a * a / 2.0, 2.0 * tones[i].phase);
    for (std::size_t j = 0; j < i; ++j) {
      lines[tones[i].cycles + tones[j].cycles] +=
          std::polar(a * a, tones[i].phase + tones[j].phase);
      lines[tones[i].cycles - tones[j].cycles] +=
          std::polar(a * a, tones[i].phase - tones[j].phase);
    }
  }
  SquarePowers out;
  for (const auto& [k, z] : lines) {
    if (k < 20 || k > 20000) continue;
    (on_mains(k) ? out.mains : out.even) += 0.5 * std::norm(z);
  }
  return out;
}

double tones_mean_square() { return std::pow(1.0 / multitone_crest(), 2); }

double steady_thd(const std::function<double(double)>& curve) {
  const TakeSpec spec = spec_for("steady", 997.0, -6.0);
  return *read(spec, response(spec, curve)).levels[0].thd_f_percent;
}

}  // namespace

TEST_CASE("a wire: nothing but rounding, and no band filled") {
  const TakeSpec spec = spec_for("multitone", 0.0, -6.0);
  TakeVerdict verdict;
  const Curves c = read(spec, response(spec, wire), {}, &verdict);
  CHECK(verdict.settled);
  CHECK_FALSE(verdict.clipped);
  CHECK(*figure(c, "noise-plus-distortion").value < -250.0);
  CHECK(*figure(c, "fill").value == 0.0);
  CHECK(*figure(c, "fill").expanded_u == 0.0);
  CHECK(figure(c, "fill").state == "80 dB SPL");
  CHECK(*figure(c, "listening-level").value == 80.0);
  for (const TracePoint& t : c.traces) {
    if (t.value) CHECK(std::isfinite(*t.value));
  }
}

TEST_CASE("a square law: every product where it belongs, to the last digit") {
  // y = x + 0.01 x^2, at a rate at which no product folds.
  const Hertz rate(96000.0);
  const double peak = 0.5;
  const TakeSpec spec = spec_for("multitone", 0.0, 20.0 * std::log10(peak), rate);
  const Curves c = read(spec, response(
                                  spec, [](double x) { return x + 0.01 * x * x; }, 0.0, 1, rate));
  const SquarePowers square = square_powers();
  const double scale = std::pow(0.01 * peak, 2) / tones_mean_square();
  CHECK(*figure(c, "even-distortion").value ==
        doctest::Approx(10.0 * std::log10(scale * square.even)).epsilon(1e-9));
  CHECK(*figure(c, "distortion").value ==
        doctest::Approx(10.0 * std::log10(scale * square.even)).epsilon(1e-9));
  CHECK(*figure(c, "mains-multiples").value ==
        doctest::Approx(10.0 * std::log10(scale * square.mains)).epsilon(1e-9));
  CHECK(*figure(c, "noise-plus-distortion").value ==
        doctest::Approx(10.0 * std::log10(scale * (square.even + square.mains))).epsilon(1e-9));
  CHECK(*figure(c, "odd-distortion").value < -250.0);
}

TEST_CASE("noise alone is noise: limits, the right power, and no band filled by it") {
  const TakeSpec spec = spec_for("multitone", 0.0, -6.0);
  const double sigma = 1e-4;
  const Curves c = read(spec, response(spec, wire, sigma, 4));
  for (const std::string id : {"distortion", "even-distortion", "odd-distortion"}) {
    CAPTURE(id);
    CHECK(figure(c, id).flag == Flag::noise);
    CHECK_FALSE(figure(c, id).expanded_u);
    CHECK(*figure(c, id).value < *figure(c, "noise").value - 20.0);
  }
  CHECK(*figure(c, "fill").value == 0.0);

  // Noise far above what would be heard: still no distortion, but it may hide some.
  const Curves loud = read(spec, response(spec, wire, 0.03, 5));
  CHECK(figure(loud, "fill").flag == Flag::noise);
  CHECK(*figure(loud, "fill").value > 0.0);
  CHECK_FALSE(figure(loud, "fill").expanded_u);
}

TEST_CASE("Monte Carlo: totals cover the truth in 95 %") {
  const TakeSpec spec = spec_for("multitone", 0.0, -6.0);
  const auto curve = [](double x) { return std::tanh(x + 0.1) - std::tanh(0.1); };
  const double sigma = 1e-3;
  const Curves truth = read(spec, response(spec, curve));
  const Waveform clean = response(spec, curve);
  // White noise has 2 sigma^2 / N in each bin; 20 Hz to 20 kHz but for tones and mains multiples.
  double bins = 0.0;
  for (std::size_t k = 20; k <= 20000; ++k) bins += on_mains(k) ? 0.0 : 1.0;
  bins -= kMultitoneTones;
  const std::map<std::string, double> expected{
      {"distortion", *figure(truth, "distortion").value},
      {"even-distortion", *figure(truth, "even-distortion").value},
      {"odd-distortion", *figure(truth, "odd-distortion").value}};
  // Tones' power at the output, to turn the noise into dB.
  const double noise_spl = 2.0 * sigma * sigma / 48000.0 * bins;
  double tones = 0.0;
  {
    // From noise-plus-distortion: total power of the block less DC, over 1 + its ratio. What is
    // under 20 Hz and above 20 kHz counts in the total and not in the ratio: 0.1 % at most here.
    const Stimulus s = find_method("multitone")->stimulus(spec, Hertz(48000.0));
    double mean = 0.0, squares = 0.0;
    for (std::size_t n = s.hold.first_block; n < s.hold.first_block + s.hold.block; ++n) {
      mean += clean.samples[n] / 48000.0;
      squares += clean.samples[n] * clean.samples[n] / 48000.0;
    }
    tones = (squares - mean * mean) /
            (1.0 + std::pow(10.0, *figure(truth, "noise-plus-distortion").value / 10.0));
  }
  const double noise_db = 10.0 * std::log10(noise_spl / tones);

  constexpr int kRepeats = 60;
  std::map<std::string, int> covered;
  int settled = 0;
  for (unsigned r = 0; r < kRepeats; ++r) {
    Waveform take = clean;
    std::mt19937_64 random(100 + r);
    std::normal_distribution<double> noise(0.0, sigma);
    for (double& x : take.samples) x += noise(random);
    TakeVerdict verdict;
    const Curves c = read(spec, take, {}, &verdict);
    settled += verdict.settled;
    for (const auto& [id, value] : expected) {
      covered[id] += std::abs(*figure(c, id).value - value) <= *figure(c, id).expanded_u;
    }
    const ScalarPoint& n = figure(c, "noise");
    covered["noise"] += std::abs(*n.value - noise_db) <= *n.expanded_u;
  }
  // Four figures, together wrong with 0.1 % chance.
  const boost::math::binomial b(kRepeats, 0.95);
  const double least = boost::math::quantile(b, 0.001 / 4.0);
  for (const auto& [id, count] : covered) {
    CAPTURE(id);
    MESSAGE(id, ": ", count, " of ", kRepeats);
    CHECK(count >= least);
  }
  CHECK(settled == kRepeats);
}

TEST_CASE("symmetric and asymmetric curves of the same THD are told apart") {
  constexpr double kThd = 2.0;
  const auto at_thd = [&](double bias) {
    double low = 0.01, high = 2.0;
    const auto curve = [bias](double drive) {
      return [=](double x) { return std::tanh(drive * x + bias) - std::tanh(bias); };
    };
    for (int i = 0; i < 25; ++i) {
      const double middle = 0.5 * (low + high);
      (steady_thd(curve(middle)) < kThd ? low : high) = middle;
    }
    return curve(low);
  };
  const TakeSpec spec = spec_for("multitone", 0.0, -6.0);
  const auto symmetric_curve = at_thd(0.0), biased_curve = at_thd(0.4);
  const Curves symmetric = read(spec, response(spec, symmetric_curve, 1e-6, 7));
  const Curves biased = read(spec, response(spec, biased_curve, 1e-6, 8));
  CHECK(figure(symmetric, "even-distortion").flag == Flag::noise);
  CHECK(*figure(biased, "even-distortion").value > *figure(biased, "odd-distortion").value + 20.0);
  CHECK(*figure(symmetric, "odd-distortion").value >
        *figure(symmetric, "even-distortion").value + 60.0);
  // Difference tones of a bent curve stand low in the spectrum: at the same THD its distortion
  // falls less towards the bass.
  const auto tilt = [](const Curves& c) {
    const auto d = trace(c, "distortion");
    return *d[24].value - *d[1].value;
  };
  CHECK(tilt(symmetric) > tilt(biased) + 5.0);
  // Their fill is about the same: as many bands are reached, by products of another kind.
  CHECK(std::abs(*figure(symmetric, "fill").value - *figure(biased, "fill").value) <= 5.0);
  CHECK(*figure(symmetric, "fill").value > 0.0);
  MESSAGE("fill ", *figure(symmetric, "fill").value, " and ", *figure(biased, "fill").value, " %");
}

TEST_CASE("bands: one ERB each, levels in dB SPL that move with the listening level") {
  TakeSpec spec = spec_for("multitone", 0.0, -6.0);
  const auto curve = [](double x) { return std::tanh(2.0 * x + 0.2) - std::tanh(0.2); };
  const Waveform take = response(spec, curve, 1e-6, 9);
  const Curves at80 = read(spec, take);
  spec.options.listening_db_spl = 60.0;
  const Curves at60 = read(spec, take);
  const auto d80 = trace(at80, "distortion"), d60 = trace(at60, "distortion");
  const auto t80 = trace(at80, "masked-threshold"), t60 = trace(at60, "masked-threshold");
  REQUIRE(d80.size() == 40);
  REQUIRE(t80.size() == 40);
  double bands = 0.0, filled = 0.0;
  for (std::size_t i = 0; i < d80.size(); ++i) {
    CHECK(erb_number(Hertz(d80[i].x)) == doctest::Approx(1.5 + static_cast<double>(i)));
    CHECK(*d80[i].value - *d60[i].value == doctest::Approx(20.0).epsilon(1e-9));
    // What masks falls by 20 dB at most (threshold in quiet, upward spread).
    CHECK(*t80[i].value - *t60[i].value >= -1e-9);
    CHECK(*t60[i].value >= threshold_in_quiet(Hertz(t60[i].x)) - 1e-9);
    bands += std::pow(10.0, (*d80[i].value - 80.0) / 10.0);
    filled += *d80[i].value > *t80[i].value;
  }
  // All bands together: the whole distortion but for what lies under 26 Hz and above 18.6 kHz.
  const double whole = std::pow(10.0, *figure(at80, "distortion").value / 10.0);
  CHECK(bands < whole);
  CHECK(bands > 0.8 * whole);
  // Every band is clear of its threshold by far more than the noise.
  CHECK(*figure(at80, "fill").value == doctest::Approx(100.0 * filled / 40.0));
  CHECK(figure(at60, "fill").state == "60 dB SPL");
}

TEST_CASE("mains lines that wander are neither distortion nor noise") {
  const TakeSpec spec = spec_for("multitone", 0.0, -6.0);
  Waveform take = response(spec, wire, 1e-5, 3);
  const Curves clean = read(spec, take);
  for (std::size_t n = 0; n < take.samples.size(); ++n) {
    const double t = static_cast<double>(n) / 48000.0;
    for (const int order : {1, 3, 5}) {
      take.samples[n] += 1e-4 * std::cos(2.0 * std::numbers::pi * order * 50.05 * t + order);
    }
  }
  const Curves c = read(spec, take);
  CHECK(figure(c, "distortion").flag == Flag::noise);
  // Three lines of peak 1e-4 over the tones; 0.25 Hz off, the fifth keeps 0.8 of its power in its
  // bin.
  const double hum = 3.0 * 0.5e-8 / (0.25 * tones_mean_square());
  CHECK(*figure(c, "mains-multiples").value ==
        doctest::Approx(10.0 * std::log10(hum)).epsilon(0.01));
  CHECK(*figure(c, "noise").value == doctest::Approx(*figure(clean, "noise").value).epsilon(0.001));
  CHECK(*figure(c, "noise-plus-distortion").value > *figure(clean, "noise-plus-distortion").value);
}

TEST_CASE("a delay that drifts from block to block costs nothing") {
  constexpr Hertz kRate(192000.0);  // nothing up to order 4 folds
  const TakeSpec spec = spec_for("multitone", 0.0, -6.0, kRate);
  const auto curve = [](double x) { return std::tanh(x + 0.1) - std::tanh(0.1); };
  const Stimulus s = find_method("multitone")->stimulus(spec, kRate);
  const auto drifting = [&](double per_block) {
    Waveform take = s.wave;
    for (int b = 0; b < s.hold.blocks; ++b) {
      std::vector<std::complex<double>> spectrum(s.hold.block / 2 + 1);
      for (const MultitoneTone& t : multitone_tones()) {
        const double turn = 2.0 * std::numbers::pi * static_cast<double>(t.cycles) * per_block * b /
                            static_cast<double>(s.hold.block);
        spectrum[t.cycles] = std::polar(0.005 * static_cast<double>(s.hold.block), t.phase - turn);
      }
      const std::vector<double> x = inverse_fft(spectrum, s.hold.block);
      std::transform(x.begin(), x.end(),
                     take.samples.begin() + static_cast<long>(s.hold.first_block) +
                         b * static_cast<long>(s.hold.block),
                     curve);
    }
    return take;
  };
  // A sample of 192 kHz turns 19.8 kHz by 37 degrees.
  const Curves still = read(spec, drifting(0.0)), moved = read(spec, drifting(1.0));
  for (const std::string id : {"distortion", "even-distortion", "odd-distortion"}) {
    CAPTURE(id);
    // Even products on mains multiples turn as well, by 2 pi 1000 / 192000 at most, and pass for
    // lines 0.005 bins off: what is taken off beside them is 46 dB and more under those few.
    CHECK(std::abs(*figure(moved, id).value - *figure(still, id).value) < 1e-3);
  }
}

TEST_CASE("the rig's own curve is told by its harmonics") {
  // A rig y = x + 0.002 x^2 + 0.001 x^3 and nothing else: at peak 0.5 its second harmonic is 0.0005
  // (a2 P / 2), its third 0.0000625 (a3 P^2 / 4).
  const TakeSpec spec = spec_for("multitone", 0.0, 20.0 * std::log10(0.5), Hertz(96000.0));
  const Waveform take = response(
      spec, [](double x) { return x + 0.002 * x * x + 0.001 * x * x * x; }, 1e-7, 2,
      Hertz(96000.0));
  const auto rig_with = [](double share) {
    RigView rig;
    std::vector<FloorPoint> points;
    for (const double level : {-40.0, 0.0}) {
      // The loop's residual is counted once for the send and once for the return.
      points.push_back({LevelDbfs(level), 2, Decibels::of_ratio(share * 0.0005)});
      points.push_back({LevelDbfs(level), 3, Decibels::of_ratio(share * 0.0000625)});
    }
    rig.floor = RigFloor(points);
    return rig;
  };
  const Curves alone = read(spec, take, rig_with(0.5));
  // The floor predicted is what is there, but for the share of even products on mains multiples and
  // the terms of higher order.
  for (const std::string id : {"even-distortion", "odd-distortion"}) {
    CAPTURE(id);
    CHECK(*figure(alone, id).floor == doctest::Approx(*figure(alone, id).value).epsilon(2e-4));
  }
  const Curves bounded = read(spec, take, rig_with(1.0));
  for (const std::string id : {"distortion", "even-distortion", "odd-distortion"}) {
    CHECK(figure(bounded, id).flag == Flag::floor);
  }
  CHECK(*figure(bounded, "fill").floor == 0.0);
  // A hundred times less than what is read: a value, a little wider than by noise alone.
  const Curves good = read(spec, take, rig_with(0.005));
  const Curves blind = read(spec, take);
  CHECK(figure(good, "even-distortion").flag == Flag::none);
  CHECK(*figure(good, "even-distortion").expanded_u > *figure(blind, "even-distortion").expanded_u);
  // u(a) = floor / sqrt 2 at floor = a / 100: 20 log10(1 + 1.96 * 0.01 / sqrt 2).
  CHECK(*figure(good, "even-distortion").expanded_u == doctest::Approx(0.1204).epsilon(0.03));
  CHECK_FALSE(figure(blind, "even-distortion").floor);
}

TEST_CASE("flags: clipped, unsteady, tones beyond the recorder's rate, no response") {
  TakeVerdict verdict;
  const TakeSpec spec = spec_for("multitone", 0.0, 0.0);
  Curves c = read(spec, response(spec, [](double x) { return std::clamp(2.0 * x, -1.0, 1.0); }), {},
                  &verdict);
  CHECK(verdict.clipped);
  CHECK(figure(c, "fill").flag == Flag::clipped);

  Waveform take = response(spec, [](double x) { return 0.5 * x; });
  for (std::size_t n = 0; n < take.samples.size(); ++n) {
    take.samples[n] *= 1.0 + 0.2 * std::exp(-static_cast<double>(n) / 48000.0 / 2.0);
  }
  TakeSpec slow = spec;
  slow.settings.longest_time_constant = Seconds(2.0);
  c = read(slow, take, {}, &verdict);
  CHECK_FALSE(verdict.settled);
  CHECK(figure(c, "noise-plus-distortion").flag == Flag::unsteady);

  RigView reel;
  reel.recorded_rate = Hertz(32000.0);
  c = read(spec, response(spec, [](double x) { return 0.5 * x; }), reel);
  CHECK(figure(c, "distortion").flag == Flag::alias);
  reel.recorded_rate = Hertz(44100.0);
  c = read(spec, response(spec, [](double x) { return 0.5 * x; }), reel);
  CHECK(figure(c, "distortion").flag == Flag::none);

  for (const double sigma : {0.0, 1e-5}) {
    c = read(spec, response(
                       spec, [](double) { return 0.0; }, sigma));
    REQUIRE(c.scalars.size() == 1);
    CHECK(c.scalars[0].flag == Flag::noise);
    CHECK_FALSE(c.scalars[0].value);
    CHECK(c.traces.empty());
  }
}

TEST_CASE("the drive is the sine's of the same peak, by the reference where there is one") {
  const TakeSpec spec = spec_for("multitone", 0.0, -12.0);
  const Waveform take = response(spec, wire);
  CHECK(*figure(read(spec, take), "fill").drive == doctest::Approx(-12.0));
  Waveform reference = take;
  for (double& x : reference.samples) x *= 0.5;
  Curves c;
  find_method("multitone")->read(spec, {take, &reference}, {}, c);
  CHECK(*figure(c, "fill").drive == doctest::Approx(-12.0 - 20.0 * std::log10(2.0)));
}
