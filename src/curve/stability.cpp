// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/stability.h"

#include <algorithm>
#include <boost/math/distributions/chi_squared.hpp>
#include <cmath>
#include <map>

#include "quantity/uncertain.h"

namespace kneeprint {
namespace {

constexpr double kChance = 0.001;
constexpr double kOneSided95 = 1.6448536269514722;

struct Reading {
  double db = 0.0;
  double expanded_u = 0.0;
};

// By frequency as played. Flagged readings say nothing about the gain of the settled unit.
std::map<double, std::vector<Reading>> readings_of(const Curves& curves) {
  std::map<double, std::vector<Reading>> found;
  for (const ScalarPoint& p : curves.scalars) {
    if (p.figure != "reference-gain" || p.flag != Flag::none) continue;
    if (!p.frequency_hz || !p.value || !p.expanded_u || !(*p.expanded_u > 0.0)) continue;
    found[*p.frequency_hz].push_back({*p.value, *p.expanded_u});
  }
  return found;
}

Drift drift(double frequency_hz, const std::vector<Reading>& readings, double chance) {
  // Few degrees of freedom make the expanded uncertainty wider than this; the test then only asks
  // for more.
  const double k = coverage_factor_95(kInfiniteDof);
  Drift d;
  d.frequency_hz = frequency_hz;
  d.readings = static_cast<int>(readings.size());
  double weights = 0.0, sum = 0.0, widest_u = 0.0;
  for (const Reading& r : readings) {
    const double u = r.expanded_u / k;
    weights += 1.0 / (u * u);
    sum += r.db / (u * u);
    widest_u = std::max(widest_u, u);
  }
  for (const Reading& r : readings) {
    const double residual = k * (r.db - sum / weights) / r.expanded_u;
    d.chi_square += residual * residual;
  }
  const boost::math::chi_squared expected(d.readings - 1);
  d.significant = d.chi_square > boost::math::quantile(boost::math::complement(expected, chance));
  const auto [low, high] =
      std::minmax_element(readings.begin(), readings.end(),
                          [](const Reading& a, const Reading& b) { return a.db < b.db; });
  d.range_db = high->db - low->db;
  d.range_u_db = std::hypot(high->expanded_u, low->expanded_u);
  // The true extremes, whichever they are, read at most this much closer together in 95 %.
  d.limit_db = d.range_db + kOneSided95 * std::sqrt(2.0) * widest_u;
  d.u_db = d.range_db / (2.0 * std::sqrt(3.0));
  return d;
}

void widen(Cell& expanded, double by) {
  if (expanded) *expanded = std::hypot(*expanded, by);
}

}  // namespace

std::vector<Drift> drifts_of(const Curves& curves) {
  auto readings = readings_of(curves);
  std::erase_if(readings, [](const auto& entry) { return entry.second.size() < 2; });
  std::vector<Drift> drifts;
  for (const auto& [frequency, some] : readings) {
    drifts.push_back(drift(frequency, some, kChance / static_cast<double>(readings.size())));
  }
  return drifts;
}

std::optional<Drift> drift_of(const Curves& curves) {
  const std::vector<Drift> drifts = drifts_of(curves);
  const auto widest =
      std::max_element(drifts.begin(), drifts.end(), [](const Drift& a, const Drift& b) {
        return a.significant != b.significant ? b.significant : a.range_db < b.range_db;
      });
  if (widest == drifts.end()) return std::nullopt;
  return *widest;
}

void add_drift(Curves& curves) {
  const std::optional<Drift> worst = drift_of(curves);
  if (!worst) return;
  if (worst->significant) {
    const double term = coverage_factor_95(kInfiniteDof) * worst->u_db;
    for (LevelPoint& p : curves.levels) {
      widen(p.gain_u_db, term);
      widen(p.output_u_db, term);
    }
    for (HarmonicPoint& p : curves.harmonics) widen(p.level_u_db, term);
    for (ResponsePoint& p : curves.responses) widen(p.expanded_u_db, term);
  }
  for (const Drift& d : drifts_of(curves)) {
    ScalarPoint row;
    row.method = "reference";
    row.frequency_hz = d.frequency_hz;
    row.figure = "gain-drift";
    row.value_unit = "dB";
    if (!curves.levels.empty()) row.unit = curves.levels.front().unit;
    if (d.significant) {
      row.value = d.range_db;
      row.expanded_u = d.range_u_db;
    } else {
      row.value = d.limit_db;
      row.flag = Flag::noise;
    }
    curves.scalars.push_back(row);
  }
}

}  // namespace kneeprint
