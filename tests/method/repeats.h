// SPDX-License-Identifier: GPL-3.0-or-later
// Measurements whose truth is known, made again and again with errors drawn anew: the noise of the
// take, the errors of both calibrations, the phases of the rig's residuals. What is drawn is what
// the rig states, no less: type B errors of voltage normal with the stated standard uncertainty,
// residuals of the stated amplitude with any phase (measuring a figure's interval against anything
// milder would flatter it).
#pragma once

#include <map>
#include <string>
#include <utility>
#include <vector>

#include "method/random_noise.h"
#include "method/synthetic.h"

namespace kneeprint::testing {

/// A figure as stated, and what it should have been. Same unit for all three.
struct Stated {
  std::string name;
  double low = 0.0, high = 0.0, truth = 0.0;
  bool limit = false;  ///< an upper limit: `low` is nothing
};

struct Tally {
  int repeats = 0, covered = 0, below = 0, above = 0;  ///< below: the interval lies below the truth
  int limits = 0;
  void add(const Stated& s) {
    ++repeats;
    limits += s.limit;
    if (s.high < s.truth) {
      ++below;
    } else if (s.low > s.truth) {
      ++above;
    } else {
      ++covered;
    }
  }
};

using Tallies = std::map<std::string, Tally>;

template <class Measurement>
Tallies tally(const Measurement& measurement, int repeats, unsigned seed) {
  Tallies out;
  Random random(seed);
  for (int r = 0; r < repeats; ++r) {
    for (const Stated& s : measurement.once(random)) out[s.name].add(s);
  }
  return out;
}

/// y(x) = x + c2 x^2 + ... + c5 x^5 for x in units of the nominal drive's peak.
struct Polynomial {
  double c2 = 0, c3 = 0, c4 = 0, c5 = 0;
  double operator()(double x) const { return x * (1 + x * (c2 + x * (c3 + x * (c4 + x * c5)))); }
  /// Peak of harmonic n = 1 .. 5 for x = a cos: by expanding the powers of a cosine.
  double harmonic(int n, double a) const {
    const double a2 = a * a, a3 = a2 * a, a4 = a2 * a2, a5 = a4 * a;
    switch (n) {
      case 1:
        return a + 0.75 * c3 * a3 + 0.625 * c5 * a5;
      case 2:
        return 0.5 * c2 * a2 + 0.5 * c4 * a4;
      case 3:
        return 0.25 * c3 * a3 + 0.3125 * c5 * a5;
      case 4:
        return 0.125 * c4 * a4;
      default:
        return 0.0625 * c5 * a5;
    }
  }
};

/// The polynomial with these harmonics at the nominal drive.
inline Polynomial with_harmonics(double h2, double h3, double h4, double h5) {
  Polynomial p;
  p.c5 = 16.0 * h5;
  p.c4 = 8.0 * h4;
  p.c3 = 4.0 * (h3 - 0.3125 * p.c5);
  p.c2 = 2.0 * (h2 - 0.5 * p.c4);
  return p;
}

/// What is random beside the noise, and how much of it the rig states.
struct Doubts {
  double send_db = 0.01, return_db = 0.01;  ///< standard uncertainties of the full-scale voltages
  double floor_db = -74.0;                  ///< of the loop, orders 2 .. 5
};

inline RigView rig_with(const Doubts& doubts) {
  RigView rig;
  rig.send = LevelScale::calibrated(to_volts(LevelDbu(18.0)), Decibels(doubts.send_db));
  rig.ret = LevelScale::calibrated(to_volts(LevelDbu(12.0)), Decibels(doubts.return_db));
  std::vector<FloorPoint> floor;
  for (int n = 2; n <= 5; ++n) {
    floor.push_back({LevelDbfs(0.0), n, Decibels(doubts.floor_db)});
  }
  rig.floor = RigFloor(std::move(floor));
  return rig;
}

inline double ratio_of(double db) { return std::pow(10.0, db / 20.0); }

/// Adds peak * cos(2 pi bin i / block + phase) to the hold.
inline void add_line(Waveform& w, const HoldLayout& hold, std::size_t bin, double peak,
                     double phase) {
  std::vector<double> period(hold.block);
  for (std::size_t i = 0; i < hold.block; ++i) {
    period[i] = peak * std::cos(2.0 * std::numbers::pi * static_cast<double>(bin * i % hold.block) /
                                    static_cast<double>(hold.block) +
                                phase);
  }
  for (std::size_t n = 0; n < hold.block * static_cast<std::size_t>(hold.blocks); ++n) {
    w.samples[hold.first_block + n] += period[n % hold.block];
  }
}

/// What steady and two-tone repeats share: a stimulus, a unit and a rig.
class Repeats {
 public:
  /// `line_u`: standard deviation of a line's components by the noise, over the unit's nominal
  /// fundamental (at `same` in 1/f noise).
  Repeats(TakeSpec spec, Hertz rate, Polynomial unit, Doubts doubts, NoiseKind kind, double line_u,
          Hertz same)
      : spec_(std::move(spec)),
        rig_(rig_with(doubts)),
        unit_(unit),
        kind_(kind),
        same_(same),
        stimulus_(find_method(spec_.method)->stimulus(spec_, rate)),
        nominal_(rig_.send.peak_of_level(rig_.send.level_of(spec_.send))) {
    // Amplitude: var = 2 sigma^2 / N (Rife & Boorstyn 1974).
    const double samples =
        static_cast<double>(stimulus_.hold.block) * static_cast<double>(stimulus_.hold.blocks);
    sigma_ = line_u * full_scales(1.0) * std::sqrt(samples / 2.0);
  }

 protected:
  /// Volts in units of the nominal drive's peak to samples of a perfect return.
  double full_scales(double x) const { return x * nominal_ / rig_.ret.peak_per_full_scale; }
  /// The unit's answer to the stimulus at `drive` times its nominal level, as samples.
  Waveform answer(double drive) const {
    Waveform w = stimulus_.wave;
    const double to_x = drive / sine_peak(spec_.send);
    const double scale = full_scales(1.0);
    for (double& x : w.samples) x = scale * unit_(to_x * x);
    return w;
  }
  void add_noise_to(Waveform& w, Random& random) const {
    add_noise(w, kind_, sigma_, same_, 0.01 * full_scales(1.0), random);
  }

  TakeSpec spec_;
  RigView rig_;
  Polynomial unit_;
  NoiseKind kind_;
  Hertz same_;
  Stimulus stimulus_;
  double nominal_;  // volts peak
  double sigma_ = 0.0;
};

/// A short take of `method`: blocks of at least 0.1 s, five of them.
inline TakeSpec short_spec(const std::string& method, Hertz asked) {
  TakeSpec spec;
  spec.method = method;
  spec.asked = asked;
  spec.send = LevelDbfs(-20.0);
  spec.settings.block = Seconds(0.1);
  spec.settings.blocks = 4;
  spec.hold_blocks = 5;
  return spec;
}

class SteadyRepeats : public Repeats {
 public:
  static constexpr Hertz kRate{12000.0};  // five harmonics of 997 Hz, no more

  SteadyRepeats(NoiseKind kind, double line_u, Polynomial unit, Doubts doubts = {})
      : Repeats(short_spec("steady", Hertz(997.0)), kRate, unit, doubts, kind, line_u,
                Hertz(997.0)) {
    const Curves c = read(spec_, answer(1.0), rig_);
    for (const HarmonicPoint& h : c.harmonics) {
      floor_.push_back(h.floor_db ? ratio_of(*h.floor_db) : 0.0);
    }
    cycles_ = static_cast<std::size_t>(std::llround(
        c.levels.at(0).frequency_hz * static_cast<double>(stimulus_.hold.block) / kRate.value()));
  }

  std::vector<Stated> once(Random& random) const {
    // The rig's true volts per full scale are off by what it states.
    const double drive = ratio_of(rig_.send.standard_uncertainty.value() * gaussian(random));
    const double heard = ratio_of(-rig_.ret.standard_uncertainty.value() * gaussian(random));
    double h[6] = {};
    for (int n = 1; n <= 5; ++n) h[n] = unit_.harmonic(n, drive);
    Waveform take = answer(drive);
    for (int n = 1; n <= 5; ++n) {
      add_line(take, stimulus_.hold, cycles_ * static_cast<std::size_t>(n),
               floor_[static_cast<std::size_t>(n - 1)] * full_scales(h[1]), any_phase(random));
    }
    for (double& x : take.samples) x *= heard;
    add_noise_to(take, random);

    const Curves c = read(spec_, take, rig_);
    const LevelPoint& level = c.levels.at(0);
    std::vector<Stated> out;
    const double true_level = rig_.ret.level_of_peak(full_scales(h[1]));  // of what left the unit
    const HarmonicPoint& h1 = c.harmonics.at(0);
    out.push_back({"H1", *h1.level - *h1.level_u_db, *h1.level + *h1.level_u_db, true_level});
    out.push_back({"gain", *level.gain_db - *level.gain_u_db, *level.gain_db + *level.gain_u_db,
                   true_level - (rig_.send.level_of(spec_.send) + 20.0 * std::log10(drive))});
    double squares = 0.0;
    for (int n = 2; n <= 5; ++n) {
      const HarmonicPoint& p = c.harmonics.at(static_cast<std::size_t>(n - 1));
      const double truth = std::abs(h[n] / h[1]);
      squares += truth * truth;
      const bool limit = p.flag == Flag::noise;
      out.push_back({fmt::format("H{}", n),
                     p.relative_low_db && !limit ? ratio_of(*p.relative_low_db) : 0.0,
                     ratio_of(*p.relative_high_db), truth, limit});
    }
    const double thd = *level.thd_f_percent, u = *level.thd_f_u_percent;
    out.push_back({"THD_F", level.flag == Flag::noise ? 0.0 : thd - u,
                   level.flag == Flag::noise ? thd : thd + u, 100.0 * std::sqrt(squares),
                   level.flag == Flag::noise});
    return out;
  }

 private:
  std::vector<double> floor_;  // stated, by order - 1
  std::size_t cycles_ = 0;
};

/// smpte: m2 and m3; ccif: d2 and d3.
class TwoToneRepeats : public Repeats {
 public:
  TwoToneRepeats(const std::string& method, NoiseKind kind, double line_u, Polynomial unit,
                 Doubts doubts = {})
      : Repeats(short_spec(method, Hertz(0.0)), rate_of(method), unit, doubts, kind, line_u,
                method == "smpte" ? Hertz(7000.0) : Hertz(18000.0)),
        smpte_(method == "smpte") {
    for (const IntermodPoint& p : read(spec_, answer(1.0), rig_).intermods) {
      if (p.floor_db && lines().contains(p.product)) {
        floor_[p.product] = ratio_of(*p.floor_db);
      }
    }
  }

  std::vector<Stated> once(Random& random) const {
    const double drive = ratio_of(rig_.send.standard_uncertainty.value() * gaussian(random));
    const double heard = ratio_of(-rig_.ret.standard_uncertainty.value() * gaussian(random));
    // A cubic's products, by expanding the powers of two cosines.
    const double u1 = drive * (smpte_ ? 0.8 : 0.5), u2 = drive * (smpte_ ? 0.2 : 0.5);
    const double tone1 = u1 + unit_.c3 * (0.75 * u1 * u1 * u1 + 1.5 * u1 * u2 * u2);
    const double tone2 = u2 + unit_.c3 * (0.75 * u2 * u2 * u2 + 1.5 * u2 * u1 * u1);
    const double second = std::abs(unit_.c2 * u1 * u2);
    const double third1 = std::abs(0.75 * unit_.c3 * u1 * u1 * u2);
    const double third2 = std::abs(0.75 * unit_.c3 * u2 * u2 * u1);
    std::map<std::string, double> truth;
    double reference = tone2;
    if (smpte_) {
      truth = {{"m2", 2.0 * second / tone2}, {"m3", 2.0 * third1 / tone2}};
    } else {
      reference = tone1 + tone2;
      truth = {{"d2", second / reference}, {"d3", (third1 + third2) / reference}};
    }
    Waveform take = answer(drive);
    for (const auto& [product, floor] : floor_) {
      const double phase = any_phase(random);
      const std::vector<long>& pair = lines().at(product);
      for (const long hertz : pair) {
        const auto bin = static_cast<std::size_t>(
            std::lround(static_cast<double>(hertz) * static_cast<double>(stimulus_.hold.block) /
                        take.rate.value()));
        add_line(take, stimulus_.hold, bin,
                 full_scales(floor * reference) / static_cast<double>(pair.size()), phase);
      }
    }
    for (double& x : take.samples) x *= heard;
    add_noise_to(take, random);

    std::vector<Stated> out;
    for (const IntermodPoint& p : read(spec_, take, rig_).intermods) {
      if (!truth.contains(p.product)) continue;
      const double value = *p.percent / 100.0, u = value * *p.expanded_u_db / kDbPerNeper;
      const bool limit = p.flag == Flag::noise;
      out.push_back({p.product, limit ? 0.0 : value - u, limit ? value : value + u,
                     truth.at(p.product), limit});
    }
    return out;
  }

 private:
  static constexpr double kDbPerNeper = 8.685889638065036;
  static Hertz rate_of(const std::string& method) {
    return Hertz(method == "smpte" ? 24000.0 : 48000.0);
  }
  /// Where a figure's products stand, in hertz.
  static const std::map<std::string, std::vector<long>>& lines() {
    static const std::map<std::string, std::vector<long>> all{
        {"m2", {6940, 7060}}, {"m3", {6880, 7120}}, {"d2", {1000}}, {"d3", {18000, 21000}}};
    return all;
  }

  bool smpte_;
  std::map<std::string, double> floor_;
};

}  // namespace kneeprint::testing
