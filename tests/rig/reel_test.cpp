// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/reel.h"

#include <doctest/doctest.h>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <functional>
#include <numbers>
#include <random>
#include <stdexcept>

#include "quantity/failure.h"
#include "signal/resample.h"

namespace kneeprint {
namespace {

constexpr std::uint32_t kCode = 0xc0de1234;

Waveform sine(double f, double peak, std::size_t length, Hertz rate) {
  Waveform w{rate, std::vector<double>(length)};
  for (std::size_t n = 0; n < length; ++n) {
    const double t = static_cast<double>(n) / rate.value();
    const double ends = std::min({1.0, 20.0 * t, 20.0 * (w.duration().value() - t)});
    w.samples[n] = ends * peak * std::sin(2.0 * std::numbers::pi * f * t);
  }
  return w;
}

struct Reel {
  ReelLayout layout;
  std::vector<Waveform> stimuli;
  Waveform wave;
};

// Three stimuli that rise to full scale, 20 dB above the markers, `seconds` each.
Reel make_reel(double seconds, Hertz rate = Hertz(48000.0), std::uint32_t code = kCode) {
  Reel reel;
  const std::size_t length = samples_in(Seconds(seconds), rate);
  const std::vector<std::size_t> lengths{length, length + 1000, length};
  reel.layout = lay_out(lengths, rate);
  reel.stimuli = {sine(41.0, 0.1, length, rate), sine(997.0, 1.0, length + 1000, rate),
                  sine(3000.0, 1.0, length, rate)};
  reel.wave = assemble(reel.layout, reel.stimuli, code, LevelDbfs(-20.0));
  return reel;
}

// What a recorder makes of the reel. Its sample n stands at (n - lead * rate) / step in the reel.
struct Recorder {
  Hertz rate{48000.0};
  double ppm = 0.0;
  double lead_s = 0.0, tail_s = 0.0;
  double gain = 1.0;
  double noise = 0.0;
  double dc = 0.0, hum = 0.0;
  std::function<double(double)> unit = [](double x) { return x; };
  double flutter = 0.0, flutter_hz = 1.0;  // peak, of the speed

  double step(const Reel& reel) const { return rate / reel.layout.rate * (1.0 + 1e-6 * ppm); }
  double start() const { return lead_s * rate.value(); }

  Waveform record(const Reel& reel) const {
    std::vector<double> x = reel.wave.samples;
    for (double& v : x) v = unit(v);
    const double reel_per_sample = 1.0 / step(reel);
    const auto count = static_cast<std::size_t>(
        start() + static_cast<double>(x.size()) * step(reel) + tail_s * rate.value());
    Waveform out{rate, read_at(x, -start() * reel_per_sample, reel_per_sample, count)};
    if (flutter > 0.0) {
      const double turn = 2.0 * std::numbers::pi * flutter_hz / rate.value();
      std::vector<double> positions(count);
      for (std::size_t n = 0; n < count; ++n) {
        const auto at = static_cast<double>(n);
        positions[n] = at + flutter / turn * std::sin(turn * at);
      }
      out.samples = read_at(std::vector<double>(out.samples), positions);
    }
    std::mt19937 random(7);
    std::normal_distribution<double> normal(0.0, 1.0);
    for (std::size_t n = 0; n < count; ++n) {
      const double mains =
          std::sin(2.0 * std::numbers::pi * 50.0 * static_cast<double>(n) / rate.value());
      out.samples[n] = gain * out.samples[n] + noise * normal(random) + dc + hum * mains;
    }
    return out;
  }
};

std::string refusal(const Waveform& recording, const ReelLayout& layout,
                    std::optional<std::uint32_t> code = {}) {
  try {
    find_reel(recording, layout, "tape.wav", code);
  } catch (const InputError& e) {
    const std::string sentence = e.what();
    CHECK(sentence.starts_with("tape.wav: "));
    return sentence;
  }
  return "(accepted)";
}

bool says(const std::string& sentence, const std::string& words) {
  return sentence.find(words) != std::string::npos;
}

}  // namespace

TEST_CASE("everything stands in the reel where the layout says, at its level") {
  const Reel reel = make_reel(1.0);
  CHECK(reel.wave.samples.size() == reel.layout.length);
  CHECK(reel.wave.rate == Hertz(48000.0));
  std::size_t before = reel.layout.code;
  for (std::size_t i = 0; i < reel.layout.slots.size(); ++i) {
    const ReelSlot& slot = reel.layout.slots[i];
    CHECK(slot.start >= before + samples_in(Seconds(0.3), reel.layout.rate));
    before = slot.start + slot.length;
    CHECK(std::equal(reel.stimuli[i].samples.begin(), reel.stimuli[i].samples.end(),
                     reel.wave.samples.begin() + static_cast<long>(slot.start)));
  }
  CHECK(reel.layout.end_marker >= before + samples_in(Seconds(0.3), reel.layout.rate));
  const auto peak = [&](std::size_t from, std::size_t to) {
    const auto [least, most] =
        std::minmax_element(reel.wave.samples.begin() + static_cast<long>(from),
                            reel.wave.samples.begin() + static_cast<long>(to));
    return std::max(-*least, *most);
  };
  CHECK(peak(0, reel.layout.start_marker) == 0.0);
  CHECK(peak(reel.layout.start_marker, reel.layout.code) == doctest::Approx(0.1).epsilon(0.01));
  CHECK(peak(reel.layout.code, reel.layout.slots[0].start) == doctest::Approx(0.1).epsilon(0.01));
  CHECK(peak(reel.layout.end_marker, reel.layout.length) == doctest::Approx(0.1).epsilon(0.01));
  CHECK(peak(reel.layout.length - samples_in(Seconds(0.5), reel.layout.rate), reel.layout.length) ==
        0.0);
}

TEST_CASE("a minutes-long reel comes back from a worn recording: 44.1 kHz, inverted, 120 ppm") {
  const Reel reel = make_reel(25.0);
  Recorder recorder;
  recorder.rate = Hertz(44100.0);
  recorder.ppm = 120.0;
  recorder.lead_s = 0.37;
  recorder.tail_s = 1.0;
  recorder.gain = -std::pow(10.0, -7.3 / 20.0);
  recorder.noise = 1e-4;
  recorder.unit = [](double x) { return std::tanh(3.0 * x) / 3.0; };
  const Waveform recording = recorder.record(reel);
  const ReelFound found = find_reel(recording, reel.layout, "tape.wav", kCode);
  CHECK(std::abs(found.start - recorder.start()) < 0.02);
  CHECK(std::abs(found.step / recorder.step(reel) - 1.0) < 1e-8);
  CHECK(std::abs(found.clock_ppm - 120.0) < 0.01);
  CHECK(found.polarity == -1);
  CHECK(found.code == kCode);
  CHECK(found.match > 0.95);
  // The response is the saturated stimulus, sample for sample.
  for (std::size_t i = 0; i < reel.stimuli.size(); ++i) {
    CAPTURE(i);
    const Waveform response =
        cut(recording, found, reel.layout, reel.layout.slots[i], reel.stimuli[i]);
    CHECK(response.rate == reel.layout.rate);
    REQUIRE(response.samples.size() == reel.stimuli[i].samples.size());
    double worst = 0.0;
    for (std::size_t n = 1000; n + 1000 < response.samples.size(); ++n) {
      const double expected = recorder.gain * recorder.unit(reel.stimuli[i].samples[n]);
      worst = std::max(worst, std::abs(response.samples[n] - expected));
    }
    // Six standard deviations of noise; 0.02 sample of a 3 kHz tone of 0.14 and its third harmonic;
    // the harmonics of 3 kHz that lie above what 44.1 kHz carries, of 2e-3 and less.
    CHECK(worst < 6e-4 + (i == 2 ? 4e-3 : 1e-3));
  }
}

TEST_CASE("any usual pair of rates, either polarity, and clocks off by up to 1000 ppm") {
  const struct {
    double reel_rate, rate, ppm;
  } cases[] = {{48000, 48000, 0},    {48000, 48000, 200},  {48000, 44100, -200},
               {48000, 96000, 990},  {44100, 48000, -990}, {96000, 48000, 1.5},
               {192000, 44100, 300}, {8000, 44100, -50},   {44100, 16000, 20}};
  for (const auto& c : cases) {
    CAPTURE(c.reel_rate);
    CAPTURE(c.rate);
    CAPTURE(c.ppm);
    const Reel reel = make_reel(3.0, Hertz(c.reel_rate));
    Recorder recorder;
    recorder.rate = Hertz(c.rate);
    recorder.ppm = c.ppm;
    recorder.lead_s = 1.0123;
    const ReelFound found = find_reel(recorder.record(reel), reel.layout, "tape.wav", kCode);
    CHECK(std::abs(found.start - recorder.start()) < 0.01);
    const double drift =
        (found.step / recorder.step(reel) - 1.0) * static_cast<double>(reel.wave.samples.size());
    CHECK(std::abs(drift) < 0.02);
    CHECK(found.polarity == 1);
  }
}

TEST_CASE("tape: 1 % of speed error with 0.2 % of flutter, 0.5 to 10 Hz") {
  const Reel reel = make_reel(3.0);
  for (const double ppm : {-10'000.0, -3000.0, 10'000.0}) {
    for (const double flutter_hz : {0.5, 2.0, 10.0}) {
      CAPTURE(ppm);
      CAPTURE(flutter_hz);
      Recorder recorder;
      recorder.ppm = ppm;
      recorder.lead_s = 0.6;
      recorder.noise = 1e-3;
      recorder.gain = -0.5;
      recorder.flutter = 0.002;
      recorder.flutter_hz = flutter_hz;
      const ReelFound found = find_reel(recorder.record(reel), reel.layout, "tape.wav", kCode);
      // Either marker moves by the flutter's excursion, and by what its 0.2 % make of a sweep's
      // time (0.2 % of 0.14 s).
      const double moved = 48000.0 * (0.002 / (2.0 * std::numbers::pi * flutter_hz) + 0.00028);
      CHECK(std::abs(found.start - recorder.start()) < moved + 1.0);
      const double length = static_cast<double>(reel.wave.samples.size());
      CHECK(std::abs(found.step / recorder.step(reel) - 1.0) * length < 2.5 * moved + 2.0);
      CHECK(found.polarity == -1);
      CHECK(found.code == kCode);
    }
  }
}

TEST_CASE("a digital copy is read as it is: no drift, no fraction, every take bit for bit") {
  const Reel reel = make_reel(1.0);
  Recorder recorder;
  recorder.lead_s = 0.25;
  const Waveform recording = recorder.record(reel);
  const ReelFound found = find_reel(recording, reel.layout, "copy.wav", kCode);
  CHECK(found.step == 1.0);
  CHECK(found.start == 12000.0);
  CHECK(found.clock_ppm == 0.0);
  for (std::size_t i = 0; i < reel.stimuli.size(); ++i) {
    const Waveform response =
        cut(recording, found, reel.layout, reel.layout.slots[i], reel.stimuli[i]);
    double worst = 0.0;
    for (std::size_t n = 0; n < response.samples.size(); ++n) {
      worst = std::max(
          worst, std::abs(static_cast<double>(static_cast<float>(response.samples[n])) -
                          static_cast<double>(static_cast<float>(reel.stimuli[i].samples[n]))));
    }
    // Stored as float32 they are the same; the sinc's zeros leave rounding of double.
    CHECK(worst < 1e-14);
  }
}

TEST_CASE("a slot that wandering speed has moved is cut where its sound stands") {
  const Reel reel = make_reel(2.0);
  for (const double late_s : {-0.1, -0.02, 0.0, 0.0015, 0.01, 0.14}) {
    CAPTURE(late_s);
    // Only the second stimulus is late, in its gaps.
    Waveform recording = reel.wave;
    const ReelSlot& slot = reel.layout.slots[1];
    const auto begin = recording.samples.begin() + static_cast<long>(slot.start);
    std::fill(begin, begin + static_cast<long>(slot.length), 0.0);
    const long late = std::lround(late_s * 48000.0);
    std::ranges::copy(reel.stimuli[1].samples, begin + late);
    const ReelFound found = find_reel(recording, reel.layout, "tape.wav", kCode);
    const Waveform response = cut(recording, found, reel.layout, slot, reel.stimuli[1]);
    REQUIRE(response.samples.size() == slot.length);
    // Left where it is within 3 ms, else put right to a millisecond.
    const long expected = std::abs(late_s) < 0.003 ? late : 0;
    double worst = INFINITY;
    for (long off = expected - 48; off <= expected + 48; ++off) {
      double here = 0.0;
      for (std::size_t n = 10'000; n < 11'000; ++n) {
        here = std::max(here, std::abs(response.samples[n] -
                                       reel.stimuli[1].samples[n - static_cast<std::size_t>(off)]));
      }
      worst = std::min(worst, here);
    }
    CHECK(worst < 1e-3);
  }
}

TEST_CASE("minutes of silence or noise at either end, and none at all") {
  const Reel reel = make_reel(1.0);
  Recorder recorder;
  recorder.lead_s = 150.0;
  recorder.tail_s = 70.0;
  recorder.noise = 1e-3;
  const ReelFound late = find_reel(recorder.record(reel), reel.layout, "tape.wav", kCode);
  CHECK(std::abs(late.start - recorder.start()) < 0.02);
  // The recorder was started with the first chirp and stopped with the last.
  Waveform tight = reel.wave;
  tight.samples.resize(reel.layout.end_marker + samples_in(Seconds(0.25), reel.layout.rate) + 1);
  tight.samples.erase(tight.samples.begin(),
                      tight.samples.begin() + static_cast<long>(reel.layout.start_marker));
  const ReelFound early = find_reel(tight, reel.layout, "tape.wav", kCode);
  CHECK(std::abs(early.start + static_cast<double>(reel.layout.start_marker)) < 0.01);
  CHECK(std::abs(early.clock_ppm) < 0.1);
}

TEST_CASE("hard clipping, strong noise, DC and hum leave the markers and the code readable") {
  const Reel reel = make_reel(2.0);
  Recorder recorder;
  recorder.lead_s = 0.7;
  SUBCASE("clipping to a tenth") {
    recorder.unit = [](double x) { return std::clamp(x, -0.01, 0.01); };
  }
  SUBCASE("noise at the level of the markers") { recorder.noise = 0.07; }
  SUBCASE("a half-wave rectifier") {
    recorder.unit = [](double x) { return std::max(x, 0.0); };
  }
  SUBCASE("DC and hum above the markers") {
    recorder.dc = 0.3;
    recorder.hum = 0.3;
  }
  const ReelFound found = find_reel(recorder.record(reel), reel.layout, "tape.wav", kCode);
  // Cramer-Rao for the noisiest: 0.07 / (0.1 * 2 pi 3500 / 48000 * sqrt(6000)) = 0.02 sample.
  CHECK(std::abs(found.start - recorder.start()) < 0.1);
  CHECK(std::abs(found.clock_ppm) < 2.0);
}

TEST_CASE("a unit that passes only the lows is still found, late by its own delay") {
  const Reel reel = make_reel(2.0);
  Recorder recorder;
  recorder.lead_s = 0.1;
  Waveform recording = recorder.record(reel);
  // One pole at 500 Hz.
  const double a = 1.0 - std::exp(-2.0 * std::numbers::pi * 500.0 / 48000.0);
  double y = 0.0;
  for (double& x : recording.samples) x = y += a * (x - y);
  const ReelFound found = find_reel(recording, reel.layout, "tape.wav", kCode);
  CHECK(found.start > recorder.start());
  CHECK(found.start < recorder.start() + 48000.0 / (2.0 * std::numbers::pi * 500.0));
  CHECK(std::abs(found.clock_ppm) < 0.1);  // both markers are late alike
}

TEST_CASE("noise, silence or another recording has no start marker") {
  const Reel reel = make_reel(1.0);
  Waveform other{Hertz(48000.0), std::vector<double>(48000 * 20)};
  std::mt19937 random(3);
  std::normal_distribution<double> normal(0.0, 0.1);
  CHECK(says(refusal(other, reel.layout), "no start marker found (best likeness 0.00)"));
  for (double& x : other.samples) x = normal(random);
  CHECK(says(refusal(other, reel.layout), "no start marker found"));
  CHECK(says(refusal(other, reel.layout), "--channel"));
  CHECK(
      says(refusal(sine(1000.0, 1.0, 48000 * 10, Hertz(48000.0)), reel.layout), "no start marker"));
  CHECK(says(refusal({Hertz(48000.0), {0.1, 0.2}}, reel.layout), "no start marker"));
  CHECK(says(refusal({Hertz(48000.0), {}}, reel.layout), "no start marker"));
  // The start is missing: the end marker is not taken for it.
  Waveform late = reel.wave;
  late.samples.erase(late.samples.begin(),
                     late.samples.begin() + static_cast<long>(reel.layout.code));
  CHECK(says(refusal(late, reel.layout), "no start marker found"));
}

TEST_CASE("a recording that stops early says where, wherever that is") {
  const Reel reel = make_reel(2.0);
  for (const double kept : {3.0, 5.0, 8.5}) {
    Waveform recording = reel.wave;
    recording.samples.resize(samples_in(Seconds(kept), recording.rate));
    CAPTURE(kept);
    const double missing = static_cast<double>(reel.layout.end_marker) / 48000.0 + 0.25 - kept;
    REQUIRE(missing > 0.0);
    const std::string sentence = refusal(recording, reel.layout, kCode);
    CHECK(says(sentence, fmt::format("the recording stops at {:.2f} s", kept)));
    CHECK(says(sentence, fmt::format("{:.2f} s before the end", missing)));
  }
  Waveform recording = reel.wave;
  // Within the end marker.
  recording.samples.resize(reel.layout.end_marker + 6000);
  CHECK(says(refusal(recording, reel.layout), "0.12 s before the end"));
}

TEST_CASE("an edited recording or one at another speed is refused with both distances") {
  const Reel reel = make_reel(2.0);
  Waveform shorter = reel.wave;
  shorter.samples.erase(shorter.samples.begin() + 150000, shorter.samples.begin() + 174000);
  const std::string sentence = refusal(shorter, reel.layout, kCode);
  CHECK(says(sentence, "edited"));
  const double wanted =
      static_cast<double>(reel.layout.end_marker - reel.layout.start_marker) / 48000.0;
  CHECK(says(sentence, fmt::format("{:.3f} s", wanted)));
  CHECK(says(sentence, fmt::format("{:.3f} s", wanted - 0.5)));
  Recorder fast;
  for (const double ppm : {11'000.0, -11'000.0, 13'000.0}) {
    fast.ppm = ppm;
    CHECK(says(refusal(fast.record(reel), reel.layout, kCode), "another speed"));
  }
  fast.ppm = 60'000.0;
  CHECK(says(refusal(fast.record(reel), reel.layout, kCode), "at its speed to 1 %"));
  Waveform muted = reel.wave;
  std::fill(muted.samples.begin() + static_cast<long>(reel.layout.end_marker), muted.samples.end(),
            0.0);
  CHECK(says(refusal(muted, reel.layout, kCode), "no end marker found"));
}

TEST_CASE("another plan's reel is told by both codes, even when its length differs") {
  const Reel ours = make_reel(1.0), same_length = make_reel(1.0, Hertz(48000.0), 0x00000a0b),
             longer = make_reel(1.5, Hertz(48000.0), 0xfedcba98);
  CHECK(says(refusal(same_length.wave, ours.layout, kCode), "another plan's reel"));
  CHECK(says(refusal(same_length.wave, ours.layout, kCode), "its code is 00000a0b"));
  CHECK(says(refusal(same_length.wave, ours.layout, kCode), "has c0de1234"));
  CHECK(says(refusal(longer.wave, ours.layout, kCode), "its code is fedcba98"));
  CHECK(says(refusal(longer.wave, ours.layout), "another plan's reel"));
  const ReelFound found = find_reel(same_length.wave, ours.layout, "tape.wav");
  CHECK(found.code == 0x00000a0b);
  CHECK_THROWS_AS(check_code(found, kCode, "tape.wav"), InputError);
  check_code(found, 0x00000a0b, "tape.wav");
}

TEST_CASE("a gap where the code should be, and a rate too low for the markers, are told") {
  const Reel reel = make_reel(1.0);
  Waveform gated = reel.wave;
  std::fill_n(gated.samples.begin() + static_cast<long>(reel.layout.code), 4000, 0.0);
  CHECK(says(refusal(gated, reel.layout), "code after it cannot be read"));
  CHECK(says(refusal({Hertz(11025.0), std::vector<double>(50000)}, reel.layout),
             "sample rate, 11025 Hz"));
}

TEST_CASE("slots and stimuli that do not fit are a mistake of ours") {
  const Reel reel = make_reel(1.0);
  std::vector<Waveform> stimuli = reel.stimuli;
  stimuli.pop_back();
  CHECK_THROWS_AS(assemble(reel.layout, stimuli, kCode, LevelDbfs(-20.0)), std::invalid_argument);
  stimuli.push_back(reel.stimuli[1]);
  CHECK_THROWS_AS(assemble(reel.layout, stimuli, kCode, LevelDbfs(-20.0)), std::invalid_argument);
}

}  // namespace kneeprint
