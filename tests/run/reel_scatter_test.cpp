// SPDX-License-Identifier: GPL-3.0-or-later
// What a reel costs: the scatter of harmonics read from a noisy recording against the Cramer-Rao
// bound, and what is left of a straight wire. KNEEPRINT_LONG=1 repeats 5000 times.
#include <doctest/doctest.h>

#include <array>
#include <boost/math/distributions/chi_squared.hpp>
#include <cmath>
#include <cstdlib>
#include <functional>
#include <numbers>
#include <random>

#include "print/folder.h"
#include "quantity/failure.h"
#include "rig/reel.h"
#include "run/reel_run.h"
#include "run/take_reading.h"
#include "signal/resample.h"
#include "temporary_folder.h"

using namespace kneeprint;

namespace {

constexpr Hertz kRate{48000.0};
constexpr std::size_t kOrders = 5, kSlots = 8;
constexpr double kNoise = 1e-3;

bool is_long() {
  const char* asked = std::getenv("KNEEPRINT_LONG");
  return asked != nullptr && std::string(asked) == "1";
}

// Harmonics of some -20 to -50 dB.
double curve(double x) {
  return x + 0.15 * x * x - 0.2 * x * x * x + 0.2 * std::pow(x, 4) + 0.3 * std::pow(x, 5);
}

TakeSpec spec() {
  TakeSpec s;
  s.method = "steady";
  s.asked = Hertz(997.0);
  s.send = LevelDbfs(-3.0);
  s.settings.orders = static_cast<int>(kOrders);
  s.settings.block = Seconds(0.2);
  s.hold_blocks = find_method(s.method)->first_hold_blocks(s, kRate);
  return s;
}

std::array<double, kOrders> amplitudes(const Curves& c) {
  std::array<double, kOrders> out{};
  for (std::size_t k = 0; k < kOrders; ++k) {
    out[k] = std::hypot(c.harmonics.at(k).in_phase, c.harmonics.at(k).quadrature);
  }
  return out;
}

// The position in the reel, in samples, that plays at a sample of the recording.
using Warp = std::function<double(double)>;

Warp steady_clock(double ppm) {
  return [=](double n) { return (1.0 + 1e-6 * ppm) * (n - 5000.0); };
}

// 0.5 % slow, flutter of 0.1 % peak: three sines of which the peaks add up to it.
Warp tape(unsigned seed) {
  std::mt19937_64 random(seed);
  std::uniform_real_distribution<double> rate(0.5, 10.0), phase(0.0, 2.0 * std::numbers::pi);
  std::array<std::array<double, 2>, 3> sines{};
  for (auto& s : sines) s = {2.0 * std::numbers::pi * rate(random) / kRate.value(), phase(random)};
  return [=](double n) {
    double position = 0.995 * (n - 5000.0);
    for (const auto& [turn, start] : sines) {
      position += 0.001 / 3.0 / turn * std::sin(turn * n + start);
    }
    return position;
  };
}

// Sum over all takes of (error / bound)^2 for each order. The bound: var >= 2 sigma^2 / N (Rife
// and Boorstyn 1974).
struct Scatter {
  std::array<double, kOrders> sums{};
  int takes = 0;
};

Scatter scatter(int reels, const std::function<Warp(unsigned)>& warp_of) {
  const TakeSpec s = spec();
  const Stimulus stimulus = find_method(s.method)->stimulus(s, kRate);
  Waveform response = stimulus.wave;
  for (double& x : response.samples) x = curve(x);
  Curves clean;
  find_method(s.method)->read(s, {response}, {}, clean);
  const auto truth = amplitudes(clean);

  const std::vector<std::size_t> lengths(kSlots, response.samples.size());
  const ReelLayout layout = lay_out(lengths, kRate);
  const Waveform reel =
      assemble(layout, std::vector<Waveform>(kSlots, response), 0x600d5eed, LevelDbfs(-20.0));
  RigView rig;
  rig.drifting_clock = true;
  Scatter out;
  for (int r = 0; r < reels; ++r) {
    const auto seed = static_cast<unsigned>(r + 1);
    const Warp warp = warp_of(seed);
    std::vector<double> positions(reel.samples.size() + 12'000);
    for (std::size_t n = 0; n < positions.size(); ++n) positions[n] = warp(static_cast<double>(n));
    Waveform recording{kRate, read_at(reel.samples, positions)};
    std::mt19937_64 random(seed);
    std::normal_distribution<double> normal(0.0, kNoise);
    for (double& x : recording.samples) x += normal(random);

    const ReelFound found = find_reel(recording, layout, "tape.wav", 0x600d5eed);
    for (const ReelSlot& slot : layout.slots) {
      Curves c;
      const Waveform take = cut(recording, found, layout, slot, stimulus.wave);
      find_method(s.method)->read(s, {take}, rig, c);
      const double samples = c.levels.at(0).blocks * static_cast<double>(stimulus.hold.block);
      const double bound = kNoise * std::sqrt(2.0 / samples);
      const auto read = amplitudes(c);
      for (std::size_t k = 0; k < kOrders; ++k) {
        out.sums[k] += std::pow((read[k] - truth[k]) / bound, 2);
      }
      ++out.takes;
    }
  }
  return out;
}

// Two reels of five orders, two sides each: 20 checks, wrong together in 0.1 % of right programs.
void check_scatter(const Scatter& s, double allowed) {
  constexpr double kEach = 0.001 / 20.0;
  const boost::math::chi_squared chi(s.takes);
  const double least = boost::math::quantile(chi, kEach);
  const double most = boost::math::quantile(boost::math::complement(chi, kEach));
  for (std::size_t k = 0; k < kOrders; ++k) {
    CAPTURE(k + 1);
    if (is_long()) {
      MESSAGE("H" << k + 1 << ": scatter over bound " << std::sqrt(s.sums[k] / s.takes) << ", "
                  << s.takes << " takes");
    }
    CHECK(s.sums[k] > least);
    CHECK(s.sums[k] < allowed * allowed * most);
  }
}

}  // namespace

TEST_CASE("a reel with 100 ppm of drift scatters within 5 % of the Cramer-Rao bound") {
  check_scatter(scatter(is_long() ? 625 : 3, [](unsigned) { return steady_clock(100.0); }), 1.05);
}

TEST_CASE("tape, 0.5 % off with 0.1 % of flutter, scatters within 20 % of the Cramer-Rao bound") {
  check_scatter(scatter(is_long() ? 625 : 3, tape), 1.2);
}

TEST_CASE("a straight wire by a reel without drift, stored as float32: THD_F under -170 dB") {
  const testing::TemporaryFolder work;
  MeasureRequest request;
  request.into = work.path() / "wire";
  request.plan = parse_plan(
      R"({"format": "kneeprint-plan", "version": 1, "name": "wire",
          "ladder": {"from": -20, "to": 0, "step_db": 20, "unit": "dBFS"},
          "steps": [{"method": "steady", "frequencies_hz": [41, 997, 4990]}],
          "orders": 10, "block_s": 0.5, "blocks": 3})",
      "plan", method_needs());
  request.rig.kind = RigKind::reel;
  request.rig.name = "reel";
  write_reel(request);
  const PrintFolder folder(request.into);
  SilentProgress unheard;
  const RecorderRun run = ingest_reel(request.into, folder.reel_wav(), 1, unheard);
  CHECK(run.speed == 0.0);
  CHECK_FALSE(run.flutter.has_value());
  const Rig rig = read_rig(folder.rig_file());
  CHECK_FALSE(rig.marker_polarity.has_value());
  const Curves c =
      read_takes(folder, read_journal(folder.journal_file(), false), request.plan, rig);
  REQUIRE(c.levels.size() == 6);
  for (const LevelPoint& p : c.levels) {
    CAPTURE(p.frequency_hz);
    CAPTURE(p.drive);
    REQUIRE(p.thd_f_percent.has_value());
    CHECK(20.0 * std::log10(*p.thd_f_percent / 100.0) < -170.0);
  }
}
