// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/upright.h"

#include <cmath>

namespace kneeprint {
namespace {

bool usable(const LevelPoint& p) {
  return p.output && p.flag != Flag::clipped && p.flag != Flag::unsteady;
}

// Output levels such as noise and hum; ratios and times are what they are.
bool is_level(const ScalarPoint& p) { return p.value_unit == name(p.unit); }

}  // namespace

int stated_polarity(const Curves& curves, double asked_hz) {
  int polarity = 0;
  for (const LevelPoint& p : curves.levels) {
    if (p.asked_hz != asked_hz || !p.polarity || !usable(p)) continue;
    const int here = *p.polarity > 0 ? 1 : -1;
    if (polarity != 0 && polarity != here) return 0;
    polarity = here;
  }
  return polarity;
}

void make_upright(Curves& curves, int polarity) {
  if (polarity >= 0) return;
  const auto half_turn = [](Cell& phase) {
    if (phase) *phase = std::remainder(*phase + 180.0, 360.0);
  };
  for (HarmonicPoint& p : curves.harmonics) {
    if (p.order % 2 != 0) continue;
    half_turn(p.phase_deg);
    p.in_phase = -p.in_phase;
    p.quadrature = -p.quadrature;
  }
  for (ResponsePoint& p : curves.responses) {
    if (p.order % 2 == 0) half_turn(p.phase_deg);
  }
  for (ProductPoint& p : curves.products) {
    if (p.order % 2 == 0) half_turn(p.phase_deg);
  }
  for (LevelPoint& p : curves.levels) {
    if (p.dc) *p.dc = -*p.dc;
  }
}

void make_relative(Curves& curves, double asked_hz) {
  const LevelPoint* lowest = nullptr;
  for (const LevelPoint& p : curves.levels) {
    if (p.asked_hz != asked_hz || !usable(p) || p.direction == "down") continue;
    if (lowest == nullptr || p.drive < lowest->drive) {
      lowest = &p;
    }
  }
  if (lowest == nullptr) {
    for (LevelPoint& p : curves.levels) p.output = p.noise = std::nullopt;
    for (HarmonicPoint& p : curves.harmonics) p.level = std::nullopt;
    for (ProductPoint& p : curves.products) p.level = std::nullopt;
    for (ScalarPoint& p : curves.scalars) {
      if (is_level(p)) p.value = p.floor = std::nullopt;
    }
    return;
  }
  const double reference = lowest->output.value();
  // Input peak over output peak of that rung: with it the curve's gain there is 1.
  const double scale = std::pow(10.0, (lowest->drive - reference) / 20.0);
  const auto shift = [&](Cell& level) {
    if (level) *level -= reference;
  };
  for (LevelPoint& p : curves.levels) {
    shift(p.output);
    shift(p.noise);
    if (p.dc) *p.dc *= scale;
    if (p.dc_u) *p.dc_u *= scale;
  }
  for (HarmonicPoint& p : curves.harmonics) {
    shift(p.level);
    p.in_phase *= scale;
    p.quadrature *= scale;
    p.component_u *= scale;
  }
  for (ProductPoint& p : curves.products) shift(p.level);
  for (ScalarPoint& p : curves.scalars) {
    if (!is_level(p)) continue;
    shift(p.value);
    shift(p.floor);
  }
}

std::optional<bool> depends_on_frequency(const Curves& curves) {
  constexpr double kSmallest = 0.5;  // dB
  constexpr double kSameRung =
      0.5;  // dB: drives read from a reference differ a little per frequency
  constexpr double kExpandedToThreeSigma = 3.0 / 1.96;
  std::optional<bool> answer;
  for (const HarmonicPoint& a : curves.harmonics) {
    if (a.order < 2 || a.order > 3 || a.flag != Flag::none || !a.relative_db) continue;
    for (const HarmonicPoint& b : curves.harmonics) {
      if (b.order != a.order || b.frequency_hz <= a.frequency_hz || b.flag != Flag::none ||
          !b.relative_db || std::abs(a.drive - b.drive) > kSameRung) {
        continue;
      }
      const double difference = std::abs(*a.relative_db - *b.relative_db);
      const double u = std::hypot(a.expanded_u_db.value_or(0.0), b.expanded_u_db.value_or(0.0));
      if (difference > kSmallest && difference > kExpandedToThreeSigma * u) return true;
      answer = false;
    }
  }
  return answer;
}

}  // namespace kneeprint
