// SPDX-License-Identifier: GPL-3.0-or-later
// The benchmark's takes, and Kneeprint's own readings of them on one thread.
//   bench make DIR                 writes DIR/WORKLOAD.takes for every workload
//   bench time DIR WORKLOAD TIMES  prints seconds for all takes: the first call, then TIMES more
#include <fmt/format.h>

#include <array>
#include <cmath>
#include <ctime>
#include <filesystem>
#include <fstream>
#include <functional>
#include <random>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "bench/takes.h"
#include "method/coherent.h"
#include "method/method.h"
#include "platform/os.h"

namespace {

using namespace kneeprint;

constexpr Hertz kRate{96000.0};

// A workload is a method on takes over a range of drives. To add one, add a row here and a reading
// of its takes to both peers.
struct Workload {
  std::string_view name;
  std::string_view method;
  Hertz asked;
  int takes;
  std::array<Hertz, 2> tones;  // {0, 0}: the coherent tone nearest to `asked`
  Seconds sweep;               // its duration; 0: none
};
constexpr std::array<Hertz, 2> kNone{Hertz(0.0), Hertz(0.0)};
constexpr std::array kWorkloads{
    Workload{"steady", "steady", Hertz(997.0), 60, kNone, Seconds(0.0)},
    Workload{"smpte", "smpte", Hertz(0.0), 40, {Hertz(60.0), Hertz(7000.0)}, Seconds(0.0)},
    Workload{"ccif", "ccif", Hertz(0.0), 40, {Hertz(19000.0), Hertz(20000.0)}, Seconds(0.0)},
    Workload{"sweep", "sweep", Hertz(0.0), 1, kNone, Seconds(20.0)},
};

const Workload& workload_named(std::string_view name) {
  for (const Workload& w : kWorkloads) {
    if (w.name == name) return w;
  }
  throw std::runtime_error(fmt::format("no workload \"{}\"", name));
}

// As method/swept.cpp plays it.
constexpr Hertz kSweepStart{10.0}, kSweepStop{0.49 * kRate.value()};

// Three blocks of 0.3 s: with its ramps a take lasts a second. Three repeats of a sweep.
TakeSpec spec_of(const Workload& w, double send_dbfs) {
  TakeSpec spec;
  spec.method = w.method;
  spec.asked = w.asked;
  spec.send = LevelDbfs(send_dbfs);
  spec.settings.block = Seconds(0.3);
  spec.settings.blocks = 3;
  spec.hold_blocks = 3;
  if (w.sweep.value() > 0.0) spec.options.duration = w.sweep;
  return spec;
}

double send_of(const Workload& w, int take) {
  return w.takes == 1 ? -12.0 : -40.0 + 39.0 * take / (w.takes - 1);
}

// A lopsided curve and converter noise: high orders vanish in the noise at low drives.
void respond(Waveform& wave, unsigned seed) {
  std::mt19937_64 random(seed);
  std::normal_distribution<double> noise(0.0, 2e-6);
  for (double& x : wave.samples) {
    x = 0.8 * (std::tanh(x + 0.2) - std::tanh(0.2)) + noise(random);
  }
}

void make(const std::filesystem::path& folder, const Workload& w) {
  std::vector<double> sends, samples;
  TakesHeader header{};
  for (int k = 0; k < w.takes; ++k) {
    const TakeSpec spec = spec_of(w, send_of(w, k));
    Stimulus stimulus = find_method(spec.method)->stimulus(spec, kRate);
    respond(stimulus.wave, static_cast<unsigned>(k));
    const auto hold = static_cast<std::int64_t>(stimulus.hold.block) * stimulus.hold.blocks;
    const auto cycles = [&](Hertz f) {
      return static_cast<std::int64_t>(
          std::llround(f.value() * static_cast<double>(hold) / kRate.value()));
    };
    const bool one_tone = w.tones[1].value() == 0.0;
    const bool sweep = w.sweep.value() > 0.0;
    header = {w.takes,
              static_cast<std::int64_t>(stimulus.wave.samples.size()),
              static_cast<std::int64_t>(stimulus.hold.first_block),
              hold,
              static_cast<std::int64_t>(kRate.value()),
              cycles(one_tone ? stimulus.lowest_tone : w.tones[0]),
              one_tone ? 0 : cycles(w.tones[1]),
              stimulus.hold.blocks,
              sweep ? kSweepStart.value() : 0.0,
              sweep ? w.sweep.value() / std::log(kSweepStop / kSweepStart) : 0.0};
    sends.push_back(spec.send.value());
    samples.insert(samples.end(), stimulus.wave.samples.begin(), stimulus.wave.samples.end());
  }
  std::ofstream file(folder / fmt::format("{}.takes", w.name), std::ios::binary);
  const auto put = [&](const void* data, std::size_t bytes) {
    file.write(static_cast<const char*>(data), static_cast<std::streamsize>(bytes));
  };
  put(&header, sizeof header);
  put(sends.data(), sends.size() * sizeof(double));
  put(samples.data(), samples.size() * sizeof(double));
  if (!file) throw std::runtime_error("the takes cannot be written");
}

struct Takes {
  TakesHeader header{};
  std::vector<double> sends;
  std::vector<Waveform> waves;
};

Takes load(const std::filesystem::path& folder, const Workload& w) {
  std::ifstream file(folder / fmt::format("{}.takes", w.name), std::ios::binary);
  const auto get = [&](void* data, std::size_t bytes) {
    file.read(static_cast<char*>(data), static_cast<std::streamsize>(bytes));
  };
  Takes takes;
  get(&takes.header, sizeof takes.header);
  takes.sends.resize(static_cast<std::size_t>(takes.header.takes));
  get(takes.sends.data(), takes.sends.size() * sizeof(double));
  for (std::size_t k = 0; k < takes.sends.size(); ++k) {
    Waveform wave{kRate, std::vector<double>(static_cast<std::size_t>(takes.header.frames))};
    get(wave.samples.data(), wave.samples.size() * sizeof(double));
    takes.waves.push_back(std::move(wave));
  }
  if (!file) throw std::runtime_error("the takes cannot be read; run `bench make` first");
  return takes;
}

// A calibrated rig with a floor, so that no part of a reading is left out.
RigView rig() {
  RigView view;
  view.send = view.ret = LevelScale::calibrated(to_volts(LevelDbu(18.0)), Decibels(0.01));
  view.sees_dc = true;
  std::vector<FloorPoint> floor;
  for (int order = 2; order <= 10; ++order) {
    for (double level = -60.0; level <= 0.0; level += 6.0) {
      floor.push_back({LevelDbfs(level), order, Decibels(-120.0 - order)});
    }
  }
  view.floor = RigFloor(std::move(floor));
  return view;
}

void time(const std::filesystem::path& folder, const Workload& w, int times) {
  os::keep_freed_memory();  // as `kneeprint analyse` does
  const Takes takes = load(folder, w);
  const Method& method = *find_method(w.method);
  const RigView view = rig();
  std::size_t figures = 0;
  for (int k = 0; k <= times; ++k) {
    const std::clock_t begin = std::clock();  // of the processor, spent by this process alone
    Curves curves;
    for (std::size_t i = 0; i < takes.waves.size(); ++i) {
      method.read(spec_of(w, takes.sends[i]), {takes.waves[i]}, view, curves);
    }
    const double spent = static_cast<double>(std::clock() - begin) / CLOCKS_PER_SEC;
    figures = curves.harmonics.size() + curves.products.size();
    if (figures == 0) figures = curves.responses.size();
    fmt::print("{} {:.9f}\n", k == 0 ? "first" : "warm", spent);
  }
  fmt::print("figures {}\n", figures);
}

}  // namespace

int main(int argc, char** argv) {
  const std::vector<std::string> arguments(argv + 1, argv + argc);
  try {
    if (arguments.size() == 2 && arguments[0] == "make") {
      for (const Workload& w : kWorkloads) make(arguments[1], w);
      return 0;
    }
    if (arguments.size() == 4 && arguments[0] == "time") {
      time(arguments[1], workload_named(arguments[2]), std::stoi(arguments[3]));
      return 0;
    }
    fmt::print(stderr, "bench make DIR | bench time DIR WORKLOAD TIMES\n");
    return 2;
  } catch (const std::exception& e) {
    fmt::print(stderr, "bench: {}\n", e.what());
    return 1;
  }
}
