// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/reference_tone.h"

#include <fmt/format.h>

#include <algorithm>
#include <vector>

#include "method/steady.h"

namespace kneeprint {
namespace {

// Three short blocks of the fundamental alone, at the lowest rung: 0.2 s each or what whole cycles
// need (0.3 s at 997 Hz).
TakeSpec as_steady(const TakeSpec& spec) {
  TakeSpec steady = spec;
  steady.method = "steady";
  steady.send = std::min(spec.lowest, spec.send);  // never louder than the rung
  steady.settings.orders = 1;
  steady.settings.block = Seconds(0.15);
  steady.settings.blocks = 3;
  steady.settings.wanted_harmonic_u = Decibels(0.0);
  return steady;
}

const Method& steady_method() {
  static const Method steady = steady_sine();
  return steady;
}

int first_hold_blocks(const TakeSpec& spec, Hertz rate) {
  return steady_method().first_hold_blocks(as_steady(spec), rate);
}

Seconds block_length(const TakeSpec& spec, Hertz rate) {
  return steady_method().block_length(as_steady(spec), rate);
}

Stimulus stimulus(const TakeSpec& spec, Hertz rate) {
  return steady_method().stimulus(as_steady(spec), rate);
}

// Of the fundamental's level, from noise alone.
Contribution type_a(const Curves& read) {
  for (const HarmonicPoint& p : read.harmonics) {
    if (p.order == 1) return {p.noise_u_db, p.noise_dof};
  }
  return {};
}

TakeVerdict read(const TakeSpec& spec, const TakeData& take, const RigView& rig, Curves& out) {
  const TakeSpec steady = as_steady(spec);
  Curves read;
  TakeVerdict verdict = steady_method().read(steady, take, rig, read);
  const LevelPoint& level = read.levels.front();
  ScalarPoint p;
  p.method = "reference";
  p.frequency_hz = level.frequency_hz;
  p.drive = level.drive;
  p.unit = level.unit;
  p.figure = "reference-gain";
  p.state = fmt::format("rung {}", spec.rung);
  p.value_unit = "dB";
  p.flag = level.flag;
  // A level flagged as noise has a fundamental under the noise: no gain to state.
  if (level.output && level.flag != Flag::noise) {
    p.value = *level.output - level.drive;
    std::vector<Contribution> noise{type_a(read)};
    if (take.reference != nullptr) {
      Curves drive;
      steady_method().read(steady, {*take.reference}, rig, drive);
      noise.push_back(type_a(drive));
    }
    const Contribution c = combine(noise);
    p.expanded_u = coverage_factor_95(c.dof) * c.u;
  }
  out.scalars.push_back(p);
  // Of the ladder's own figures it says nothing: its level does not climb.
  verdict.thd_f_percent.reset();
  verdict.output_level.reset();
  verdict.longer.reset();
  return verdict;
}

}  // namespace

Method reference_tone() {
  return {"reference",
          "reference tone between the steps",
          "AES17-2015",
          Placement::every_rung,
          {.id = "reference", .frequencies = true},
          first_hold_blocks,
          block_length,
          stimulus,
          read,
          nullptr};
}

}  // namespace kneeprint
