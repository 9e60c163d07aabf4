// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/virtual_port.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <complex>
#include <initializer_list>
#include <map>
#include <memory>
#include <numbers>
#include <string>
#include <vector>

#include "quantity/failure.h"
#include "rig/guard.h"
#include "signal/fft.h"

using kneeprint::ConverterModel;
using kneeprint::Decibels;
using kneeprint::Hertz;
using kneeprint::LevelDbfs;
using kneeprint::parse_virtual_rig;
using kneeprint::Port;
using kneeprint::UsageError;
using kneeprint::Waveform;

namespace {

constexpr std::size_t kTail = 2000;  // more than the round trip

// The guard at its widest: these tests look at what the port does by itself.
struct Take {
  Take(Port& port, const std::vector<double>& samples, int number, bool with_reference = false)
      : stimulus{port.info().rate, samples},
        guard({LevelDbfs(0.0), LevelDbfs(6.0), kneeprint::Seconds(0.003)}, port.info().rate),
        player(stimulus, kTail, with_reference, guard) {
    port.play(player, number);
  }
  std::vector<double> returned() const {
    return {player.returned().begin(), player.returned().end()};
  }
  Waveform stimulus;
  kneeprint::Guard guard;
  kneeprint::Player player;
};

std::unique_ptr<Port> port(const char* name, const ConverterModel& model = {},
                           std::uint64_t seed = 7, double rate = 48000.0) {
  return kneeprint::make_virtual_port(parse_virtual_rig(name), Hertz(rate), seed, model);
}

ConverterModel noiseless() {
  ConverterModel model;
  model.noiseless = true;
  return model;
}

std::vector<double> sine(std::size_t size, std::size_t period, std::size_t cycles, double peak) {
  std::vector<double> x(size);
  for (std::size_t n = 0; n < size; ++n) {
    x[n] = peak * std::sin(2.0 * std::numbers::pi * static_cast<double>(cycles * n % period) /
                           static_cast<double>(period));
  }
  return x;
}

// Spectrum of the last whole `period` before the stimulus ends, scaled to peak amplitudes.
std::vector<std::complex<double>> spectrum(const std::vector<double>& x, std::size_t end,
                                           std::size_t period) {
  auto lines = kneeprint::forward_fft(std::span(x).subspan(end - period, period));
  for (auto& value : lines) value *= 2.0 / static_cast<double>(period);
  return lines;
}

double db(double ratio) { return 20.0 * std::log10(ratio); }

}  // namespace

TEST_CASE("a noiseless wire is the identity, late by its latency") {
  ConverterModel model = noiseless();
  model.latency_samples = 1000.0;
  std::vector<double> x(8000);
  for (std::size_t n = 0; n < x.size(); ++n) {
    const double fade = std::pow(std::sin(std::numbers::pi * static_cast<double>(n) / 8000.0), 2);
    x[n] = fade * (0.3 * std::sin(0.9 * static_cast<double>(n)) +
                   0.5 * std::cos(2.6 * static_cast<double>(n)));
  }
  const auto wire = port("wire", model);
  const Take take(*wire, x, 0);
  REQUIRE(take.player.returned().size() == x.size() + kTail);
  double worst = 0.0;
  for (std::size_t n = 0; n < x.size(); ++n) {
    worst = std::fmax(worst, std::fabs(take.player.returned()[n + 1000] - x[n]));
  }
  // Two roundings to float of values under 1 (3e-8 each) and the filters' -140 dB.
  CHECK(worst < 2e-7);
}

TEST_CASE("latency is the stated one at every frequency, whole and fractional") {
  struct Case {
    double latency, rate;
  };
  for (const Case& c : {Case{1473.3125, 48000.0}, Case{700.1, 48000.0}, Case{512.9371, 192000.0},
                        Case{1473.3125, 44100.0}}) {
    ConverterModel model = noiseless();
    model.latency_samples = c.latency;
    const auto wire = port("wire", model, 7, c.rate);
    constexpr std::size_t kPeriod = 4096;
    for (const std::size_t cycles : {8u, 85u, 597u, 1621u, 1800u}) {
      const std::size_t size = 3 * kPeriod;
      const Take take(*wire, sine(size, kPeriod, cycles, 0.9), 0);
      const auto sent = spectrum(take.stimulus.samples, size, kPeriod)[cycles];
      const auto got = spectrum(take.returned(), size, kPeriod)[cycles];
      // Against the expected turn, so that no whole period is lost.
      const double turn = 2.0 * std::numbers::pi * static_cast<double>(cycles) / kPeriod;
      const double error = std::arg(got / sent * std::polar(1.0, turn * c.latency)) / -turn;
      CAPTURE(c.latency);
      CAPTURE(cycles);
      // Rounding to float over 4096 samples leaves 1e-9 rad; the lowest tone turns 0.012 a sample.
      CHECK(std::fabs(error) < 1e-6);
      CHECK(std::fabs(db(std::abs(got / sent))) < 3e-5);  // two filters of 1e-5 dB and rounding
    }
  }
}

TEST_CASE("noise stands at the stated level") {
  // Silence through a cable: both converters' noise, -116 dBFS each, and two dithered quantisers
  // (q^2/4 each): in the pass-band the density is that of white noise of this power.
  ConverterModel model;
  const auto wire = port("wire", model);
  constexpr std::size_t kSize = 480000;
  const Take take(*wire, std::vector<double>(kSize, 0.0), 3);
  const auto lines = spectrum(take.returned(), kSize, kSize - 4800);
  const double half_rate_lines = static_cast<double>(lines.size() - 1);
  double power = 0.0;
  std::size_t count = 0;
  for (std::size_t k = 100; k < lines.size() * 20 / 24; ++k, ++count) {
    power += 0.5 * std::norm(lines[k]);
  }
  power *= half_rate_lines / static_cast<double>(count);
  const double quantum = std::pow(2.0, -23);
  const double expected = 2.0 * std::pow(10.0, -116.0 / 10.0) / 2.0 + 2.0 * quantum * quantum / 4.0;
  // 198 000 lines: the relative deviation of their mean power is 0.22 %, 0.01 dB; four of those.
  CHECK(std::fabs(10.0 * std::log10(power / expected)) < 0.04);
}

TEST_CASE("residual distortion is the stated one, of send and return together") {
  ConverterModel model;
  model.noise = LevelDbfs(-400.0);
  model.full_scale_u = Decibels(0.0);
  model.dither_and_quantise = false;
  const auto wire = port("wire", model);
  constexpr std::size_t kPeriod = 48000;
  for (const double level : {-0.01, -6.0}) {
    const double peak = std::pow(10.0, level / 20.0);
    const Take take(*wire, sine(2 * kPeriod, kPeriod, 997, peak), 0);
    const auto lines = spectrum(take.returned(), 2 * kPeriod, kPeriod);
    const double fundamental = std::abs(lines[997]);
    // Equal converters in phase: 6.02 dB more than one; dB for dB and twice that with level.
    // Float samples round by 1e-10 in each line, 0.2 % of the smallest, 0.015 dB; twice that.
    const double second = db(std::abs(lines[2 * 997]) / fundamental);
    const double third = db(std::abs(lines[3 * 997]) / fundamental);
    CHECK(std::fabs(second - (-128.0 + 6.0206 + level)) < 0.03);
    CHECK(std::fabs(third - (-132.0 + 6.0206 + 2 * level)) < 0.03);
    CHECK(std::fabs(db(fundamental / peak)) < 5e-5);
  }
}

TEST_CASE("the same seed and take give the same bits, whatever was played before") {
  const std::vector<double> x = sine(3000, 3000, 60, 0.5);
  for (const char* name : {"triode", "diode", "sigmoid"}) {
    const auto first = port(name), second = port(name);
    const Take one(*first, x, 1), two(*first, x, 2);
    const Take again_two(*second, x, 2), again_one(*second, x, 1), other(*second, x, 3);
    CHECK(one.player.returned() == again_one.player.returned());
    CHECK(two.player.returned() == again_two.player.returned());
    CHECK(one.player.returned() != two.player.returned());
    CHECK(other.player.returned() != two.player.returned());
    const auto reseeded = port(name, {}, 8);
    CHECK(Take(*reseeded, x, 1).player.returned() != one.player.returned());
  }
}

TEST_CASE("the hidden full scales spread as stated") {
  ConverterModel model;
  model.noise = LevelDbfs(-400.0);
  model.dither_and_quantise = false;
  constexpr std::size_t kPeriod = 480;
  constexpr int kSeeds = 400;
  double sum_squares = 0.0;
  for (int seed = 0; seed < kSeeds; ++seed) {
    const auto wire = port("wire", model, static_cast<std::uint64_t>(seed));
    const Take take(*wire, sine(2400, kPeriod, 10, 0.5), 0);
    const double gain = std::abs(spectrum(take.returned(), 2400, kPeriod)[10]) / 0.5;
    sum_squares += db(gain) * db(gain);
  }
  // Send and return, 0.01 dB each: their difference has twice the variance. Chi-square with 400
  // degrees of freedom has a relative deviation of 7.1 % in variance; four of those.
  CHECK(std::fabs(sum_squares / kSeeds / (2.0 * 0.01 * 0.01) - 1.0) < 0.29);
}

TEST_CASE("the return clips at full scale and is made of 24-bit steps") {
  const auto hot = port("sigmoid:limit=100,drive=0.02,bias=0");  // gain 2
  const Take take(*hot, sine(4800, 48, 1, 0.9), 0);
  const auto& y = take.player.returned();
  CHECK(*std::max_element(y.begin(), y.end()) == 1.0f);
  CHECK(*std::min_element(y.begin(), y.end()) == -1.0f);
  std::size_t between = 0;
  for (const float v : y) {
    const double steps = static_cast<double>(v) * 8388608.0;
    between += steps != std::nearbyint(steps);
  }
  CHECK(between == 0);
}

TEST_CASE("a reference is a split at the terminals") {
  ConverterModel model = noiseless();
  model.reference = true;
  const auto triode = port("triode", model);
  CHECK(triode->info().has_reference);
  const std::vector<double> x = sine(6000, 6000, 300, 0.7);
  const Take take(*triode, x, 0, true);
  const auto wire = port("wire", noiseless());
  const Take straight(*wire, x, 0);
  double worst = 0.0;
  for (std::size_t n = 0; n < take.player.reference().size(); ++n) {
    worst = std::fmax(worst, std::fabs(static_cast<double>(take.player.reference()[n]) -
                                       static_cast<double>(straight.player.returned()[n])));
  }
  // 32-fold against 16-fold filters: -140 dB and float rounding apart.
  CHECK(worst < 3e-7);
  CHECK(take.player.reference() != take.player.returned());
  CHECK_FALSE(port("triode")->info().has_reference);
}

TEST_CASE("the whole chain folds nothing into the band") {
  // 997 and 4987 have no divisor with 48000: all harmonics and all aliases stand on separate lines.
  constexpr std::size_t kPeriod = 48000;
  for (const char* name : {"triode", "diode", "push-pull", "sigmoid"}) {
    const auto unit = port(name, noiseless());
    const Take take(*unit, sine(2 * kPeriod, kPeriod, 4987, 0.99), 0);
    const auto lines = spectrum(take.returned(), 2 * kPeriod, kPeriod);
    double worst = 0.0;
    for (std::size_t k = 20; k <= 20000; ++k) {
      if (k % 4987) worst = std::fmax(worst, std::abs(lines[k]));
    }
    CAPTURE(name);
    CHECK(db(worst / std::abs(lines[4987])) < -120.0);
  }
}

TEST_CASE("names and settings are read, and refused in words") {
  CHECK(parse_virtual_rig("triode").unit == "triode");
  const auto name = parse_virtual_rig("sigmoid:family=atan,bias=0.2");
  CHECK(name.unit == "sigmoid");
  CHECK(name.settings == std::map<std::string, std::string>{{"family", "atan"}, {"bias", "0.2"}});
  CHECK_THROWS_WITH_AS(parse_virtual_rig("tape"),
                       "there is no virtual unit 'tape'; there are triode, diode, push-pull, "
                       "sigmoid, wire",
                       UsageError);
  for (const char* bad : {"", "sigmoid:", "sigmoid:bias", "sigmoid:bias=", "sigmoid:=1",
                          "sigmoid:bias=1,", "sigmoid:bias=1,bias=2"}) {
    CAPTURE(bad);
    CHECK_THROWS_AS(parse_virtual_rig(bad), UsageError);
  }
  CHECK_THROWS_AS(port("sigmoid:colour=red"), UsageError);
  CHECK_THROWS_AS(port("wire", {}, 7, 4000.0), UsageError);
  ConverterModel model;
  model.latency_samples = 300.0;
  CHECK_THROWS_AS(port("wire", model), UsageError);
}

TEST_CASE("the rig description states what is known, not what is hidden") {
  const auto rig =
      kneeprint::virtual_rig(parse_virtual_rig("sigmoid:family=atan,bias=0.2"), Hertz(48000.0));
  CHECK(rig.kind == kneeprint::RigKind::virtual_rig);
  CHECK(rig.device == "virtual:sigmoid:bias=0.2,family=atan");
  CHECK(rig.invented);
  CHECK(rig.dc_coupled_send);
  CHECK(rig.dc_coupled_return);
  CHECK(rig.send_scale.offset_db == doctest::Approx(24.0).epsilon(1e-6));
  CHECK(rig.send_scale.standard_uncertainty == Decibels(0.01));
  CHECK_FALSE(rig.reference_channel.has_value());
  CHECK_FALSE(rig.floor.known());
}
