// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/hysteresis.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <cmath>
#include <map>
#include <utility>

#include "curve/stability.h"
#include "quantity/uncertain.h"

namespace kneeprint {
namespace {

constexpr int kHighestOrder = 5;
constexpr double kFamily = 0.05;
constexpr double kSameDrive = 0.1;  // dB: drives read from a reference return differ a little

bool is_down(const std::string& direction) { return direction == "down"; }

struct Place {
  double frequency_hz = 0.0;
  int order = 1;
  friend auto operator<=>(const Place&, const Place&) = default;
};

/// A level over the drive, with its noise in dB.
struct Sample {
  const HarmonicPoint* point = nullptr;
  double db = 0.0;
  Contribution noise;
};

struct Difference {
  double drive = 0.0;
  LevelUnit unit = LevelUnit::dbfs;
  double db = 0.0;
  Contribution noise;
  double size() const { return std::abs(db) / noise.u; }
};

std::map<Place, std::vector<Sample>> samples_of(const Curves& curves, bool down) {
  std::map<Place, std::vector<Sample>> found;
  for (const HarmonicPoint& p : curves.harmonics) {
    if (p.order > kHighestOrder || is_down(p.direction) != down) continue;
    if (p.flag != Flag::none || !p.level || !(p.noise_u_db > 0.0)) continue;
    found[{p.frequency_hz, p.order}].push_back(
        {&p, *p.level - p.drive, {p.noise_u_db, p.noise_dof}});
  }
  return found;
}

std::vector<Difference> differences(const std::vector<Sample>& up, const std::vector<Sample>& down,
                                    const Contribution& drift) {
  std::vector<Difference> out;
  for (const Sample& d : down) {
    const auto away = [&](const Sample& s) { return std::abs(s.point->drive - d.point->drive); };
    const auto u = std::min_element(
        up.begin(), up.end(), [&](const Sample& a, const Sample& b) { return away(a) < away(b); });
    if (u == up.end() || away(*u) > kSameDrive) continue;
    const std::array parts{u->noise, d.noise, drift};
    out.push_back({d.point->drive, d.point->unit, d.db - u->db, combine(parts)});
  }
  return out;
}

double quantile(double dof, double chance) {
  if (!(dof < 1e9)) {
    return boost::math::quantile(boost::math::complement(boost::math::normal(), chance));
  }
  return boost::math::quantile(boost::math::complement(boost::math::students_t(dof), chance));
}

// In units of what the comparison at its own degrees of freedom may show: the one to report.
const Difference& largest(const std::vector<Difference>& some) {
  return *std::max_element(some.begin(), some.end(), [](const Difference& a, const Difference& b) {
    return a.size() < b.size();
  });
}

ScalarPoint row_of(const Place& place, const Difference& d, double comparisons) {
  ScalarPoint row;
  row.method = "steady";
  row.frequency_hz = place.frequency_hz;
  row.drive = d.drive;
  row.unit = d.unit;
  row.figure = place.order == 1 ? "ladder-loop-gain" : fmt::format("ladder-loop-h{}", place.order);
  row.value_unit = "dB";
  if (d.size() > quantile(d.noise.dof, kFamily / (2.0 * comparisons))) {
    row.value = d.db;
    row.expanded_u = coverage_factor_95(d.noise.dof) * d.noise.u;
  } else {
    row.value = std::abs(d.db) + quantile(d.noise.dof, 0.05) * d.noise.u;
    row.flag = Flag::noise;
  }
  return row;
}

}  // namespace

void add_hysteresis(Curves& curves) {
  const auto up = samples_of(curves, false), down = samples_of(curves, true);
  std::map<Place, std::vector<Difference>> all;
  Contribution drift;
  if (const auto d = drift_of(curves); d && d->significant) drift.u = std::sqrt(2.0) * d->u_db;
  double comparisons = 0.0;
  for (const auto& [place, samples] : down) {
    const auto same = up.find(place);
    if (same == up.end()) continue;
    auto some = differences(same->second, samples, drift);
    if (some.empty()) continue;
    comparisons += static_cast<double>(some.size());
    all[place] = std::move(some);
  }
  for (const auto& [place, some] : all) {
    curves.scalars.push_back(row_of(place, largest(some), comparisons));
  }
}

Curves ascending(Curves curves) {
  const auto down = [](const auto& p) { return is_down(p.direction); };
  std::erase_if(curves.levels, down);
  std::erase_if(curves.harmonics, down);
  return curves;
}

}  // namespace kneeprint
