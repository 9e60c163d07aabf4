// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/player.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <limits>
#include <new>
#include <type_traits>
#include <utility>
#include <vector>

using kneeprint::Guard;
using kneeprint::GuardReason;
using kneeprint::Hertz;
using kneeprint::LevelDbfs;
using kneeprint::Player;
using kneeprint::Seconds;
using kneeprint::Waveform;

namespace {

thread_local std::size_t allocations = 0;

void* counted(std::size_t size) {
  ++allocations;
  if (void* memory = std::malloc(size > 0 ? size : 1)) return memory;
  throw std::bad_alloc();
}

}  // namespace

// Of the whole test program: the test of allocation counts with them.
void* operator new(std::size_t size) { return counted(size); }
void* operator new[](std::size_t size) { return counted(size); }
void operator delete(void* memory) noexcept { std::free(memory); }
void operator delete[](void* memory) noexcept { std::free(memory); }
void operator delete(void* memory, std::size_t) noexcept { std::free(memory); }
void operator delete[](void* memory, std::size_t) noexcept { std::free(memory); }

namespace {

constexpr Hertz kRate{48000.0};

Waveform stimulus(std::size_t size) {
  Waveform w{kRate, std::vector<double>(size)};
  for (std::size_t n = 0; n < size; ++n) w.samples[n] = 0.5 * std::sin(0.7 * (1.0 + n));
  return w;
}

Guard open_guard() { return Guard({LevelDbfs(0.0), LevelDbfs(-0.1), Seconds(0.003)}, kRate); }

// A cable behind a driver: what was sent comes back `delay` samples later, and the driver hands
// buffers out one after the other. Delay >= block, as with every driver.
struct Cable {
  std::size_t delay;
  float gain = 1.0f;
  std::vector<float> sent{};

  // Plays to the end; false when the player does not end within `most` buffers.
  bool play(Player& player, std::size_t block, std::size_t most = 1000000) {
    std::vector<float> returned(block), out(block);
    for (std::size_t i = 0; i < most; ++i) {
      for (std::size_t n = 0; n < block; ++n) {
        const std::size_t at = sent.size() + n;
        returned[n] = at >= delay ? gain * sent[at - delay] : 0.0f;
      }
      const bool more = player.process(returned, {}, out);
      sent.insert(sent.end(), out.begin(), out.end());
      if (!more) return true;
    }
    return false;
  }
};

}  // namespace

static_assert(noexcept(std::declval<Player&>().process({}, {}, {})));
static_assert(noexcept(std::declval<Player&>().count_dropout()));
// A stimulus that would be gone before the first buffer does not compile.
static_assert(!std::is_constructible_v<Player, Waveform&&, std::size_t, bool, Guard&>);
static_assert(std::is_constructible_v<Player, const Waveform&, std::size_t, bool, Guard&>);

TEST_CASE("buffers of any size send the stimulus and record all of its return") {
  const Waveform w = stimulus(5000);
  constexpr std::size_t kTail = 4500, kDelay = 4096;
  for (const std::size_t block : {1u, 7u, 64u, 255u, 256u, 257u, 1000u, 4096u}) {
    CAPTURE(block);
    Guard guard = open_guard();
    Player player(w, kTail, false, guard);
    REQUIRE(player.length() == 9500);
    Cable cable{kDelay};
    REQUIRE(cable.play(player, block));
    CHECK(cable.sent.size() == (9500 + block - 1) / block * block);
    CHECK(player.recorded() == 9500);
    CHECK(player.progress() == 1.0);
    for (std::size_t n = 0; n < cable.sent.size(); ++n) {
      REQUIRE(cable.sent[n] == (n < 5000 ? static_cast<float>(w.samples[n]) : 0.0f));
    }
    for (std::size_t n = 0; n < 9500; ++n) {
      REQUIRE(player.returned()[n] == (n < kDelay ? 0.0f : cable.sent[n - kDelay]));
    }
    CHECK(guard.reason() == GuardReason::none);
    CHECK(player.dropouts() == 0);
  }
}

TEST_CASE("sizes may change from buffer to buffer, and may be zero") {
  const Waveform w = stimulus(3000);
  Guard guard = open_guard();
  Player player(w, 100, false, guard);
  std::vector<float> sent;
  std::size_t played = 0;
  bool more = true;
  for (const std::size_t block : {1000u, 0u, 1u, 777u, 1200u, 121u, 1u}) {
    REQUIRE(more);
    std::vector<float> returned(block), out(block);
    for (std::size_t n = 0; n < block; ++n) returned[n] = 1e-4f * static_cast<float>(played + n);
    more = player.process(returned, {}, out);
    sent.insert(sent.end(), out.begin(), out.end());
    played += block;
    CHECK(player.recorded() == played);
  }
  CHECK_FALSE(more);  // 3100 samples, and not one more
  for (std::size_t n = 0; n < 3100; ++n) {
    REQUIRE(sent[n] == (n < 3000 ? static_cast<float>(w.samples[n]) : 0.0f));
    REQUIRE(player.returned()[n] == 1e-4f * static_cast<float>(n));
  }
}

TEST_CASE("called after its end it records nothing and sends silence") {
  const Waveform w = stimulus(300);
  Guard guard = open_guard();
  Player player(w, 0, true, guard);
  std::vector<float> ones(512, 0.25f), out(512, 9.0f);
  CHECK_FALSE(player.process(ones, ones, out));
  const std::vector<float> recorded = player.returned();
  CHECK(recorded == std::vector<float>(300, 0.25f));
  CHECK(out[299] == static_cast<float>(w.samples[299]));
  CHECK(std::all_of(out.begin() + 300, out.end(), [](float v) { return v == 0.0f; }));
  std::vector<float> others(512, 0.75f);
  for (int i = 0; i < 3; ++i) {
    std::fill(out.begin(), out.end(), 9.0f);
    CHECK_FALSE(player.process(others, others, out));
    CHECK(out == std::vector<float>(512, 0.0f));
  }
  CHECK(player.returned() == recorded);
  CHECK(player.reference() == recorded);
  CHECK(player.recorded() == 300);
}

TEST_CASE("the reference is kept when it is wanted and wired") {
  const Waveform w = stimulus(200);
  const std::vector<float> returned(200, 0.1f), reference(200, 0.2f);
  std::vector<float> out(200);
  Guard guard = open_guard();
  Player with(w, 0, true, guard), without(w, 0, false, guard), unwired(w, 0, true, guard);
  with.process(returned, reference, out);
  without.process(returned, reference, out);
  unwired.process(returned, {}, out);
  CHECK(with.returned() == returned);
  CHECK(with.reference() == reference);
  CHECK(without.returned() == returned);
  CHECK(without.reference().empty());
  CHECK(unwired.reference() == std::vector<float>(200, 0.0f));
}

TEST_CASE("a hot return ends the take with the guard's ramp") {
  const Waveform w = stimulus(48000);
  Guard guard = open_guard();
  Player player(w, 4800, false, guard);
  Cable cable{600, 2.0f};  // 0.5 comes back as 1.0
  REQUIRE(cable.play(player, 100));
  CHECK(guard.reason() == GuardReason::return_hot);
  CHECK(guard.silent());
  CHECK(cable.sent.back() == 0.0f);
  // The first sine crest stands within 9 samples of the start and returns 600 later, in the
  // seventh buffer; that buffer and the next hold the ramp of 144 samples.
  CHECK(player.recorded() == 800);
  CHECK(player.progress() == doctest::Approx(800.0 / 52800.0));
  CHECK(cable.sent[599] == static_cast<float>(w.samples[599]));
  CHECK(cable.sent[600 + 143] == 0.0f);
}

TEST_CASE("a return that is no number ends it, too") {
  const Waveform w = stimulus(4800);
  Guard guard = open_guard();
  Player player(w, 0, false, guard);
  std::vector<float> returned(480, 0.0f), out(480);
  CHECK(player.process(returned, {}, out));
  returned[479] = std::numeric_limits<float>::quiet_NaN();
  CHECK_FALSE(player.process(returned, {}, out));
  CHECK(guard.reason() == GuardReason::return_hot);
}

TEST_CASE("a person's mute ends it within the ramp") {
  const Waveform w = stimulus(48000);
  Guard guard = open_guard();
  Player player(w, 0, false, guard);
  Cable cable{64};
  REQUIRE_FALSE(cable.play(player, 64, 10));
  player.mute();
  REQUIRE(cable.play(player, 64));
  CHECK(guard.reason() == GuardReason::cancelled);
  CHECK(cable.sent.size() == 640 + 192);  // 144 samples of ramp fill three buffers of 64
  CHECK(cable.sent.back() == 0.0f);
}

TEST_CASE("a stimulus over the ceiling does not leave") {
  const Waveform w = stimulus(48000);
  Guard guard({LevelDbfs(-20.0), LevelDbfs(-0.1), Seconds(0.003)}, kRate);
  Player player(w, 0, false, guard);
  Cable cable{256};
  REQUIRE(cable.play(player, 256));
  CHECK(guard.reason() == GuardReason::over_ceiling);
  for (const float v : cable.sent) REQUIRE(std::fabs(v) <= 0.1f);
}

TEST_CASE("progress and dropouts are counted") {
  const Waveform w = stimulus(600);
  Guard guard = open_guard();
  Player player(w, 200, false, guard);
  CHECK(player.progress() == 0.0);
  std::vector<float> returned(200), out(200);
  for (int i = 1; i <= 4; ++i) {
    CHECK(player.process(returned, {}, out) == (i < 4));
    CHECK(player.progress() == 0.25 * i);
    player.count_dropout();
    CHECK(player.dropouts() == i);
  }
  const Waveform nothing{kRate, {}};
  Player empty(nothing, 0, false, guard);
  CHECK(empty.progress() == 1.0);
  CHECK_FALSE(empty.process(returned, {}, out));
  CHECK(out == std::vector<float>(200, 0.0f));
}

TEST_CASE("the body of the callback allocates nothing") {
  const std::size_t idle = allocations;
  const Waveform w = stimulus(5000);
  Guard guard = open_guard();
  Player player(w, 1000, true, guard);
  std::vector<float> returned(512, 0.1f), reference(512, 0.1f), out(512);
  CHECK(allocations > idle);  // so the count works
  const std::size_t before = allocations;
  bool more = true;
  int buffers = 0;
  for (; more; ++buffers) {
    if (buffers == 3) player.count_dropout();
    if (buffers == 6) returned[5] = 1.0f;  // the guard trips
    more = player.process(returned, reference, out);
  }
  const std::size_t after = allocations;
  CHECK(after == before);
  CHECK(buffers == 7);  // the ramp of 144 samples ends within the buffer that trips
}
