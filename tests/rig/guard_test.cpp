// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/guard.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <numbers>
#include <random>
#include <set>
#include <string>
#include <thread>
#include <vector>

using kneeprint::Guard;
using kneeprint::GuardLimits;
using kneeprint::GuardReason;
using kneeprint::Hertz;
using kneeprint::LevelDbfs;
using kneeprint::Seconds;

namespace {

constexpr Hertz kRate{48000.0};
constexpr std::size_t kRamp = 144;  // 3 ms
constexpr double kNan = std::numeric_limits<double>::quiet_NaN();
constexpr double kInf = std::numeric_limits<double>::infinity();
constexpr std::array kReasons{GuardReason::not_a_number, GuardReason::over_ceiling,
                              GuardReason::return_hot, GuardReason::cancelled};

// Steepest step of a raised cosine of kRamp samples: its slope is at most pi/2 over the whole.
constexpr double kSteepest = std::numbers::pi / 2.0 / kRamp;
// A sample of magnitude up to 1 rounds to float within 2^-25 (3e-8), so a step within twice that.
constexpr double kFloat = 6e-8;

GuardLimits limits(double ceiling) { return {LevelDbfs(ceiling), LevelDbfs(-0.1), Seconds(0.003)}; }

std::vector<float> through(Guard& guard, const std::vector<double>& wanted) {
  std::vector<float> out(wanted.size(), 123.0f);
  guard.process(wanted, out);
  return out;
}

// 0.5 (1 + cos(pi k / N)), k samples after the trip; zero from k = N on.
double raised_cosine(std::size_t k) {
  if (k >= kRamp) return 0.0;
  return 0.5 * (1.0 + std::cos(std::numbers::pi * static_cast<double>(k) / kRamp));
}

}  // namespace

static_assert(noexcept(std::declval<Guard&>().process({}, {})));
static_assert(noexcept(std::declval<Guard&>().watch({})));
static_assert(noexcept(std::declval<Guard&>().mute(GuardReason::cancelled)));

TEST_CASE("what keeps the ceiling passes bit for bit, and the ceiling itself is kept") {
  for (const double ceiling : {0.0, -0.3, -6.0, -20.0, -60.0}) {
    CAPTURE(ceiling);
    Guard guard(limits(ceiling), kRate);
    const double peak = std::pow(10.0, ceiling / 20.0);
    std::vector<double> x(4800);
    for (std::size_t n = 0; n < x.size(); ++n) {
      x[n] = peak * std::cos(2.0 * std::numbers::pi * static_cast<double>(n % 48) / 48.0);
    }
    x[7] = 0.0;
    x[8] = -0.0;
    x[9] = std::numeric_limits<double>::denorm_min();
    x[10] = -1e-42;  // a denormal as float too
    const std::vector<float> y = through(guard, x);
    const bool same = std::equal(x.begin(), x.end(), y.begin(),
                                 [](double a, float b) { return static_cast<float>(a) == b; });
    CHECK(same);
    CHECK(guard.reason() == GuardReason::none);
    CHECK_FALSE(guard.silent());
  }
}

TEST_CASE("one sample over the ceiling, of either sign, trips and never leaves") {
  // The guard leaves 1e-6 of room for rounding: 3e-6 more must not pass.
  for (const double sign : {1.0, -1.0}) {
    Guard guard(limits(-20.0), kRate);
    std::vector<double> x(400, 0.02);
    x[100] = sign * 0.1 * (1.0 + 3e-6);
    const std::vector<float> y = through(guard, x);
    CHECK(guard.reason() == GuardReason::over_ceiling);
    CHECK(y[99] == 0.02f);
    for (std::size_t k = 1; k <= 300; ++k) {
      REQUIRE(std::fabs(y[99 + k] - 0.02 * raised_cosine(k)) < kFloat);
    }
  }
}

TEST_CASE("no number and infinity fade from the last good sample") {
  for (const double bad : {kNan, -kNan, kInf, -kInf}) {
    Guard guard(limits(-20.0), kRate);
    std::vector<double> x(400, -0.07);
    std::fill(x.begin() + 50, x.end(), bad);
    const std::vector<float> y = through(guard, x);
    CHECK(guard.reason() == GuardReason::not_a_number);
    for (std::size_t k = 1; k <= 350; ++k) {
      REQUIRE(std::fabs(y[49 + k] + 0.07 * raised_cosine(k)) < kFloat);
    }
    CHECK(guard.silent());
  }
  Guard at_once(limits(-20.0), kRate);  // nothing good before: silence from the first sample
  const std::vector<float> y = through(at_once, std::vector<double>(200, kNan));
  CHECK(std::all_of(y.begin(), y.end(), [](float v) { return v == 0.0f; }));
}

TEST_CASE("a program that asked for the impossible is not followed back") {
  // Over the ceiling at the crest, then good samples at the other end of the range.
  for (const double bad : {kNan, 0.5}) {
    Guard guard(limits(-20.0), kRate);
    std::vector<double> x(300, 0.1);
    x[20] = bad;
    std::fill(x.begin() + 21, x.end(), -0.1);
    const std::vector<float> y = through(guard, x);
    for (std::size_t n = 1; n < y.size(); ++n) {
      REQUIRE(std::fabs(y[n] - y[n - 1]) <= 0.1 * kSteepest + kFloat);
    }
  }
}

TEST_CASE("a mute begins at the next sample and is a raised cosine of 3 ms, then zeros") {
  for (const std::size_t block : {1u, 7u, 144u, 1000u}) {
    CAPTURE(block);
    Guard guard(limits(0.0), kRate);
    CHECK(through(guard, {0.5, 0.5}) == std::vector<float>{0.5f, 0.5f});
    guard.mute(GuardReason::cancelled);
    CHECK_FALSE(guard.silent());
    std::size_t k = 0;
    while (k < 2 * kRamp) {
      const bool was_over = k >= kRamp;
      CHECK(guard.silent() == was_over);
      for (const float v : through(guard, std::vector<double>(block, 0.5))) {
        ++k;
        REQUIRE(std::fabs(v - 0.5 * raised_cosine(k)) < kFloat);
        if (k >= kRamp) REQUIRE(v == 0.0f);
      }
    }
    CHECK(guard.silent());
  }
}

TEST_CASE("the ramp lasts 3 ms at every rate") {
  for (const double rate : {8000.0, 44100.0, 96000.0, 192000.0}) {
    CAPTURE(rate);
    Guard guard(limits(0.0), Hertz(rate));
    guard.mute(GuardReason::cancelled);
    const auto y = through(guard, std::vector<double>(2000, 1.0));
    const auto zero = std::find(y.begin(), y.end(), 0.0f) - y.begin() + 1;
    // 132.3 samples at 44.1 kHz: over with the 133rd. The cosine's last steps may round to zero
    // early: 0.25 (pi / N)^2 is above 1e-5 even at N = 576, so they do not.
    CHECK(static_cast<double>(zero) == std::ceil(0.003 * rate - 1e-9));
  }
}

TEST_CASE("a mute by hand fades the running sound rather than holding it") {
  Guard guard(limits(0.0), kRate);
  std::vector<double> x(kRamp);
  for (std::size_t n = 0; n < x.size(); ++n) x[n] = std::sin(0.13 * static_cast<double>(n));
  guard.mute(GuardReason::return_hot);
  const auto y = through(guard, x);
  for (std::size_t n = 0; n < y.size(); ++n) {
    REQUIRE(std::fabs(y[n] - x[n] * raised_cosine(n + 1)) < kFloat);
  }
}

TEST_CASE("nothing gets past the guard: random programs") {
  std::mt19937_64 random(20260501);
  std::uniform_real_distribution<double> unit(-1.0, 1.0);
  int tripped_by_program = 0, tripped_from_outside = 0;
  for (int trial = 0; trial < 400; ++trial) {
    const double ceiling = -30.0 * (0.5 + 0.5 * unit(random));
    const double peak = std::pow(10.0, ceiling / 20.0);
    Guard guard(limits(ceiling), kRate);
    const double dc = peak * unit(random);
    const int kind = trial % 4;  // of program: noise, DC, sine, everything at once
    const bool muted = trial % 5 == 0;
    bool followed = true;  // the program has been usable so far
    double before = 0.0, before_wanted = 0.0;
    std::size_t since_trip = 0;
    GuardReason first = GuardReason::none;
    for (int buffer = 0; buffer < 12; ++buffer) {
      std::vector<double> x(1 + random() % 300);
      for (std::size_t n = 0; n < x.size(); ++n) {
        const double noise = peak * unit(random), t = static_cast<double>(n);
        x[n] = kind == 1 ? dc : kind == 2 ? peak * std::sin(0.01 * t) : noise;
      }
      if (buffer == 5 || (kind == 3 && buffer > 5)) {
        const std::array bad{kNan, kInf, -kInf, 1e300, -1e300, 1.01 * peak, -2.0 * peak};
        for (int i = 0; i < 3; ++i) x[random() % x.size()] = bad[random() % bad.size()];
      }
      if (muted && buffer == 3) guard.mute(GuardReason::cancelled);
      const std::vector<float> y = through(guard, x);
      if (buffer < 3) REQUIRE(guard.reason() == GuardReason::none);
      for (std::size_t n = 0; n < y.size(); ++n) {
        const double out = y[n];
        REQUIRE(std::isfinite(out));
        // 1e-6 is the room that the guard leaves for rounding, 1e-7 the rounding to float.
        REQUIRE(std::fabs(out) <= peak * (1.0 + 1.1e-6));
        followed = followed && std::fabs(x[n]) <= peak;
        if (since_trip > 0 || !followed || (muted && buffer >= 3)) {
          ++since_trip;
          const double own = followed ? std::fabs(x[n] - before_wanted) : 0.0;
          REQUIRE(std::fabs(out - before) <= peak * kSteepest + own + kFloat);
          if (since_trip >= kRamp) REQUIRE(out == 0.0);
        }
        if (followed) before_wanted = x[n];
        before = out;
      }
      if (first == GuardReason::none) first = guard.reason();
      REQUIRE(guard.reason() == first);
    }
    REQUIRE(first != GuardReason::none);
    REQUIRE((first == GuardReason::cancelled) == muted);
    ++(muted ? tripped_from_outside : tripped_by_program);
    REQUIRE(guard.silent());
  }
  CHECK(tripped_from_outside == 80);
  CHECK(tripped_by_program == 320);
}

TEST_CASE("the return mutes at its limit, and when it is no number") {
  const float limit = static_cast<float>(std::pow(10.0, -0.1 / 20.0));
  struct Case {
    float value;
    bool hot;
  };
  for (const Case& c : {Case{0.0f, false},
                        {0.98f, false},
                        {-0.98f, false},
                        {std::nextafter(limit, 0.0f), false},
                        {limit, true},
                        {-limit, true},
                        {1.0f, true},
                        {-7.0f, true},
                        {std::numeric_limits<float>::infinity(), true},
                        {std::numeric_limits<float>::quiet_NaN(), true}}) {
    CAPTURE(c.value);
    Guard guard(limits(-20.0), kRate);
    std::vector<float> returned(256, 0.0f);
    returned[200] = c.value;
    guard.watch(returned);
    CHECK(guard.reason() == (c.hot ? GuardReason::return_hot : GuardReason::none));
    guard.watch({});
    CHECK(guard.reason() == (c.hot ? GuardReason::return_hot : GuardReason::none));
  }
}

TEST_CASE("a limit that is no number lets nothing out") {
  Guard guard(limits(kNan), kRate);
  const auto y = through(guard, std::vector<double>(500, 1e-3));
  CHECK(std::all_of(y.begin(), y.end(), [](float v) { return v == 0.0f; }));
  CHECK(guard.reason() == GuardReason::over_ceiling);
}

TEST_CASE("the first reason stays") {
  for (const GuardReason first : kReasons) {
    Guard guard(limits(-20.0), kRate);
    guard.mute(GuardReason::none);
    CHECK(guard.reason() == GuardReason::none);
    guard.mute(first);
    for (const GuardReason later : kReasons) guard.mute(later);
    through(guard, {kNan, 5.0});
    const std::array<float, 1> hot{2.0f};
    guard.watch(hot);
    CHECK(guard.reason() == first);
  }
}

TEST_CASE("another thread may mute while audio runs") {
  Guard guard(limits(0.0), kRate);
  const std::vector<double> x(64, 0.5);
  std::vector<float> sent;
  const auto play = [&](int buffers) {
    for (int i = 0; i < buffers; ++i) {
      const auto y = through(guard, x);
      sent.insert(sent.end(), y.begin(), y.end());
    }
  };
  play(2);
  std::thread person([&] { guard.mute(GuardReason::cancelled); });
  play(500);
  person.join();
  play(4);  // 256 samples, more than the ramp, certainly after the mute
  CHECK(guard.reason() == GuardReason::cancelled);
  CHECK(guard.silent());
  CHECK(sent.back() == 0.0f);
  // Wherever it fell, it fell as one ramp.
  const auto begin = std::find_if(sent.begin(), sent.end(), [](float v) { return v != 0.5f; });
  for (auto v = begin; v != sent.end(); ++v) {
    const auto k = static_cast<std::size_t>(v - begin) + 1;
    REQUIRE(std::fabs(*v - 0.5 * raised_cosine(k)) < kFloat);
  }
}

TEST_CASE("every reason has an id of its own and says what happened") {
  std::set<std::string_view> ids;
  std::set<std::string> sentences;
  for (const GuardReason reason : kReasons) {
    ids.insert(kneeprint::name(reason));
    const std::string text = kneeprint::sentence(reason);
    CHECK(text.find("mute") != std::string::npos);
    CHECK(text.find("  ") == std::string::npos);
    sentences.insert(text);
  }
  // The journal keeps these.
  CHECK(ids ==
        std::set<std::string_view>{"not-a-number", "over-ceiling", "return-hot", "cancelled"});
  CHECK(sentences.size() == kReasons.size());
  CHECK(kneeprint::name(GuardReason::none).empty());
  CHECK(kneeprint::sentence(GuardReason::none).empty());
}
