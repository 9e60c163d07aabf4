// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/time_base.h"

#include <doctest/doctest.h>
#include <fmt/format.h>

#include <cmath>
#include <cstdio>
#include <numbers>
#include <random>
#include <vector>

#include "method/reading.h"
#include "method/synthetic.h"
using namespace kneeprint;
using kneeprint::testing::read;
using kneeprint::testing::spec_for;
namespace {
constexpr double kTurn = 2.0 * std::numbers::pi;
struct Wow { double rate_hz, peak, phase; };
// Time of the reel, in s, at the time t of the recording.
struct Warp {
  double speed = 0.0;
  std::vector<Wow> wows;
  double at(double t) const {
    double u = t * (1.0 + speed);
    for (const Wow& w : wows) u += w.peak / (kTurn * w.rate_hz) * std::sin(kTurn * w.rate_hz * t + w.phase);
    return u;
  }
};
struct Component { double cycles_per_s; double peak; double phase; };
}  // namespace
TEST_CASE("trial") {
  for (double f : {41.0, 997.0, 4990.0}) for (double rate : {0.5, 1.0,2.0,5.0,7.0,10.0}) for (double speed : {0.0, 3e-4}) {
    const TakeSpec spec = spec_for("steady", f, -3.0);
    const Stimulus s = find_method("steady")->stimulus(spec, Hertz(48000));
    const double f0 = s.lowest_tone.value();
    const Warp warp{speed, {{rate, 0.002, 0.3}}};
    Waveform w = s.wave;
    const double mid = 0.5*(s.hold.first_block + s.hold.end())/48000.0;
    const double peaks[] = {0, 0.7, 0.07, -0.02, 0.005, 0.002};
    for (std::size_t n = 0; n < w.samples.size(); ++n) {
      const double t = mid + warp.at(n/48000.0 - mid);
      double x = 0; for (int k = 1; k <= 5; ++k) if (k*f0 < 21600) x += peaks[k]*std::cos(kTurn*k*f0*(t - s.hold.first_block/48000.0));
      // steady before and after
      w.samples[n] = (t > 0.012 && t < w.duration().value()-0.012) ? x : 0.0;
    }
    RigView rig; rig.drifting_clock = true;
    const std::size_t cyc = std::llround(f0*s.hold.block/48000.0);
    const SteadiedTake st = steady_time(w, s.hold, std::array{cyc});
    const Curves c = read(spec, w, rig);
    fmt::print("{:6.0f} {:4.1f} {:.4f}: drifts {} speed {:.2e} flutter {:.5f} jitter {:.2e} |", f, rate, speed, st.time.drifts, st.time.speed, st.time.flutter, st.time.jitter.value());
    for (int k = 1; k <= 5; ++k) if (k*f0<21600) { auto& h = c.harmonics[k-1]; fmt::print(" {:+.6f}", 20*std::log10(std::hypot(h.in_phase,h.quadrature)/std::abs(peaks[k]))); }
    fmt::print("  u5 {:.5f}\n", c.harmonics[2].expanded_u_db.value_or(-1));
  }
}

TEST_CASE("trial2") {
  for (double snr : {-10.0, 0.0, 10.0, 20.0, 40.0, 60.0}) for (double f : {41.0, 997.0, 4990.0}) for (double fl : {0.0, 0.001}) {
    const TakeSpec spec = spec_for("steady", f, -3.0);
    const Stimulus s = find_method("steady")->stimulus(spec, Hertz(48000));
    const double f0 = s.lowest_tone.value();
    const Warp warp{0.0, {{0.7, fl, 0.3}, {3.3, 0.5*fl, 1.0}, {9.1, 0.5*fl, 2.0}}};
    Waveform w = s.wave;
    const double mid = 0.5*(s.hold.first_block + s.hold.end())/48000.0;
    const double peaks[] = {0, 0.7, 0.07, -0.02, 0.005, 0.002};
    for (std::size_t n = 0; n < w.samples.size(); ++n) {
      const double t = mid + warp.at(n/48000.0 - mid);
      double x = 0; for (int k = 1; k <= 5; ++k) if (k*f0 < 21600) x += peaks[k]*std::cos(kTurn*k*f0*(t - s.hold.first_block/48000.0));
      w.samples[n] = (t > 0.012 && t < w.duration().value()-0.012) ? x : 0.0;
    }
    std::mt19937 rnd(5); std::normal_distribution<double> nd;
    const double sigma = 0.7/std::sqrt(2.0)*std::pow(10.0,-snr/20);
    for (auto& x : w.samples) x += sigma*nd(rnd);
    RigView rig; rig.drifting_clock = true;
    const std::size_t cyc = std::llround(f0*s.hold.block/48000.0);
    const SteadiedTake st = steady_time(w, s.hold, std::array{cyc});
    const Curves c = read(spec, w, rig);
    fmt::print("{:6.0f} snr {:4.1f} {:.4f}: drifts {} speed {:.2e} flutter {:.5f} jitter {:.2e} |", f, snr, fl, st.time.drifts, st.time.speed, st.time.flutter, st.time.jitter.value());
    const double u = sigma*std::sqrt(2.0/(s.hold.block*c.levels[0].blocks));
    for (int k = 1; k <= 5; ++k) if (k*f0<21600 && c.harmonics.size()) { auto& h = c.harmonics[k-1]; fmt::print(" {:+.2f}({:.2f})", (std::hypot(h.in_phase,h.quadrature)-std::abs(peaks[k]))/u, h.component_u/u); }
    fmt::print("\n");
  }
}
