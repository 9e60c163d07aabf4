// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/floor.h"

#include <algorithm>
#include <cmath>
#include <functional>
#include <span>
#include <tuple>

namespace kneeprint {
namespace {

using Line = std::span<const FloorPoint>;  // one harmonic or product, all frequencies and levels
using LevelOf = std::function<LevelDbfs(const FloorPoint&)>;

auto key(const FloorPoint& p) {
  return std::tuple(p.order, std::string_view(p.product), p.frequency, p.level, p.return_level());
}

// Figures at rising levels of the one converter. Where several were measured at the same level, the
// one with the lowest level at the other stands: the other's share is least there.
std::vector<std::pair<LevelDbfs, Decibels>> profile(Line line, Hertz frequency, const LevelOf& own,
                                                    const LevelOf& other) {
  constexpr double kSameLevel = 0.5;  // dB: a pad's value is not whole decibels
  std::vector<const FloorPoint*> points;
  for (const FloorPoint& p : line) {
    if (p.frequency == frequency) points.push_back(&p);
  }
  std::sort(points.begin(), points.end(), [&](auto* a, auto* b) {
    return std::pair(own(*a), other(*a)) < std::pair(own(*b), other(*b));
  });
  std::vector<std::pair<LevelDbfs, Decibels>> out;
  LevelDbfs lowest_other;
  for (const FloorPoint* p : points) {
    const bool same = !out.empty() && (own(*p) - out.back().first).value() < kSameLevel;
    if (same && other(*p) >= lowest_other) continue;
    if (same) out.pop_back();
    out.emplace_back(own(*p), p->relative);
    lowest_other = other(*p);
  }
  return out;
}

std::optional<double> interpolated(const std::vector<std::pair<LevelDbfs, Decibels>>& profile,
                                   LevelDbfs level) {
  constexpr double kRounding = 1e-6;  // dB: a level read back from a take
  if (profile.empty()) return std::nullopt;
  if (level.value() <= profile.front().first.value() + kRounding) {
    return profile.front().second.ratio();
  }
  const auto above = std::find_if(profile.begin() + 1, profile.end(), [&](const auto& p) {
    return p.first.value() >= level.value() - kRounding;
  });
  if (above == profile.end()) return std::nullopt;
  const auto below = above - 1;
  const double share = (level - below->first).value() / (above->first - below->first).value();
  return (below->second + share * (above->second - below->second)).ratio();
}

std::optional<double> at_one_frequency(Line line, Hertz frequency, LevelDbfs send, LevelDbfs ret) {
  const LevelOf sent = [](const FloorPoint& p) { return p.level; };
  const LevelOf returned = [](const FloorPoint& p) { return p.return_level(); };
  const auto of_send = interpolated(profile(line, frequency, sent, returned), send);
  const auto of_return = interpolated(profile(line, frequency, returned, sent), ret);
  if (!of_send || !of_return) return std::nullopt;
  return *of_send + *of_return;
}

// The frequencies whose figures count at `wanted`.
std::vector<Hertz> neighbours(Line line, Hertz wanted) {
  std::vector<Hertz> all;
  for (const FloorPoint& p : line) {
    if (all.empty() || all.back() != p.frequency) all.push_back(p.frequency);
  }
  if (wanted.value() <= 0.0 || all.size() < 2) return all;
  constexpr double kAsPlayed = 0.002;  // tones are shifted by up to 0.1 %
  for (const Hertz f : all) {
    if (std::abs(f / wanted - 1.0) < kAsPlayed) return {f};
  }
  const auto above = std::lower_bound(all.begin(), all.end(), wanted);
  if (above == all.begin()) return {all.front()};
  if (above == all.end()) return {all.back()};
  return {*(above - 1), *above};
}

std::optional<double> bound(Line line, LevelDbfs send, LevelDbfs ret, Hertz frequency) {
  std::optional<double> largest;
  for (const Hertz f : neighbours(line, frequency)) {
    const auto here = at_one_frequency(line, f, send, ret);
    if (!here) return std::nullopt;
    largest = std::max(largest.value_or(0.0), *here);
  }
  return largest;
}

}  // namespace

RigFloor::RigFloor(std::vector<FloorPoint> points) : points_(std::move(points)) {
  std::sort(points_.begin(), points_.end(),
            [](const FloorPoint& a, const FloorPoint& b) { return key(a) < key(b); });
}

std::optional<double> RigFloor::at(LevelDbfs send, LevelDbfs ret, int order,
                                   Hertz frequency) const {
  const auto first = std::find_if(points_.begin(), points_.end(), [&](const FloorPoint& p) {
    return p.order == order && p.product.empty();
  });
  const auto last = std::find_if(first, points_.end(), [&](const FloorPoint& p) {
    return p.order != order || !p.product.empty();
  });
  return bound({first, last}, send, ret, frequency);
}

std::optional<double> RigFloor::at_product(LevelDbfs send, LevelDbfs ret, std::string_view method,
                                           std::string_view product) const {
  std::string wanted(method);
  wanted += ' ';
  wanted += product;
  const auto is_wanted = [&](const FloorPoint& p) { return p.product == wanted; };
  const auto first = std::find_if(points_.begin(), points_.end(), is_wanted);
  return bound({first, std::find_if_not(first, points_.end(), is_wanted)}, send, ret, Hertz(0.0));
}

}  // namespace kneeprint
