// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/cable_floor.h"

#include <cmath>

#include "method/block_spectra.h"
#include "method/coherent.h"
#include "quantity/failure.h"
#include "run/chain_check.h"

namespace kneeprint {
namespace {

constexpr Hertz kFloorTone{997.0};
constexpr Seconds kIntegration{10.0};
constexpr double kStep = 10.0, kLowest = -60.0;  // dBFS

std::vector<Waveform> play(Port& port, const Waveform& stimulus, std::size_t tail, Guard& guard,
                           int take) {
  Player player(stimulus, tail, false, guard);
  port.play(player, take);
  return {{port.info().rate, {player.returned().begin(), player.returned().end()}}};
}

}  // namespace

RigFloor measure_floor(Port& cable, LevelDbfs ceiling, int orders) {
  const Hertz rate = cable.info().rate;
  Guard guard({ceiling, LevelDbfs(0.1), Seconds(0.003)}, rate);
  const Waveform chirp = chain_check_stimulus(rate, LevelDbfs(-40.0));
  const ChainCheck chain =
      judge_chain(chirp, play(cable, chirp, samples_in(Seconds(1.0), rate), guard, 0));
  const auto delay = static_cast<std::size_t>(std::lround(chain.delay));

  const Method& steady = *find_method("steady");
  TakeSpec spec;
  spec.method = steady.id;
  spec.asked = kFloorTone;
  spec.settings.orders = orders;
  spec.hold_blocks = static_cast<int>(std::lround(kIntegration / steady.block_length(spec, rate)));
  const CoherentTone tone = coherent_tone(spec.asked, rate, spec.settings.block, orders);

  std::vector<FloorPoint> points;
  int take = 1;
  for (double level = kLowest; level <= ceiling.value() + 1e-9; level += kStep) {
    spec.send = LevelDbfs(level);
    const Stimulus stimulus = steady.stimulus(spec, rate);
    Waveform heard =
        play(cable, stimulus.wave, delay + samples_in(Seconds(0.05), rate), guard, take++).front();
    if (heard.samples.size() < delay + stimulus.wave.samples.size()) {
      throw GuardStop("rig floor: " + sentence(guard.reason()));
    }
    heard.samples.erase(heard.samples.begin(), heard.samples.begin() + static_cast<long>(delay));
    const BlockSpectra spectra(heard, stimulus.hold, tone.cycles);
    const auto line = [&](int n) {
      return spectra.mean(tone.cycles * static_cast<std::size_t>(n), 0,
                          [&](int b) { return n * std::arg(spectra.at(b, tone.cycles)); });
    };
    const double fundamental = std::abs(line(1).mean);
    for (int n = 2; n <= orders && n * tone.frequency.value() < 0.45 * rate.value(); ++n) {
      const Line l = line(n);
      // The noise adds 2 u^2 to the mean square of a line's amplitude; taken off, at least u
      // remains.
      const double residual = std::sqrt(std::max(std::norm(l.mean) - 2.0 * l.u * l.u, l.u * l.u));
      if (residual > 0.0) {
        points.push_back({spec.send, n, Decibels::of_ratio(residual / fundamental)});
      }
    }
  }
  return RigFloor(std::move(points));
}

}  // namespace kneeprint
