// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/loop.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "method/method.h"
#include "quantity/failure.h"
#include "run/chain_check.h"

namespace kneeprint {
namespace {

constexpr double kStep = 10.0, kLowest = -60.0;  // dBFS
constexpr LevelDbfs kResponseLevel{-20.0};       // far from either end of the converters
constexpr Hertz kReference{997.0};               // where full-scale voltages are stated
constexpr Seconds kAfterTake{0.05};

// 10 dB apart from the ceiling down.
std::vector<LevelDbfs> levels_below(LevelDbfs ceiling) {
  std::vector<LevelDbfs> out;
  for (double level = ceiling.value(); level >= kLowest - 1e-9; level -= kStep) {
    out.emplace_back(level);
  }
  if (out.empty()) out.push_back(ceiling);
  std::reverse(out.begin(), out.end());
  return out;
}

class Loop {
 public:
  Loop(Port& cable, const LoopRequest& request, Progress& progress)
      : cable_(cable),
        request_(request),
        progress_(progress),
        rate_(cable.info().rate),
        guard_({request.ceiling, LevelDbfs(0.1), Seconds(0.003)}, rate_) {}

  LoopResult measure();

 private:
  Curves take(const std::string& method, Hertz asked, LevelDbfs send, Seconds hold);
  Waveform play(const Waveform& stimulus, std::size_t tail);
  void harmonics(Hertz asked, LevelDbfs send);
  void products(const std::string& method, LevelDbfs send);
  void response();

  Port& cable_;
  const LoopRequest& request_;
  Progress& progress_;
  Hertz rate_;
  Guard guard_;
  double delay_ = 0.0;
  int played_ = 0, takes_ = 0;
  LoopResult result_;
};

Waveform Loop::play(const Waveform& stimulus, std::size_t tail) {
  Player player(stimulus, tail, false, guard_);
  cable_.play(player, played_++);
  if (guard_.reason() != GuardReason::none) {
    throw GuardStop("rig floor: " + sentence(guard_.reason()));
  }
  if (player.dropouts() > 0) {
    throw DeviceError(
        "rig floor: the audio driver lost frames; use a larger buffer, close other programs, then "
        "start again");
  }
  return {rate_, {player.returned().begin(), player.returned().end()}};
}

Curves Loop::take(const std::string& id, Hertz asked, LevelDbfs send, Seconds hold) {
  const Method& method = *find_method(id);
  TakeSpec spec;
  spec.method = id;
  spec.asked = asked;
  spec.send = spec.lowest = send;
  spec.settings.orders = request_.orders;
  spec.hold_blocks =
      std::max(method.first_hold_blocks(spec, rate_),
               static_cast<int>(std::lround(hold / method.block_length(spec, rate_))));
  const Stimulus stimulus = method.stimulus(spec, rate_);
  const auto delay = static_cast<std::size_t>(std::lround(delay_));
  progress_.step({played_, 0,
                  asked.value() > 0.0 ? fmt::format("{} {:g} Hz", id, asked.value()) : id,
                  fmt::format("{:g} dBFS", send.value()), stimulus.wave.duration()});
  Waveform heard = play(stimulus.wave, delay + samples_in(kAfterTake, rate_));
  heard.samples.erase(heard.samples.begin(), heard.samples.begin() + static_cast<long>(delay));
  Curves curves;
  method.read(spec, {heard, nullptr, delay_ - static_cast<double>(delay)}, RigView{}, curves);
  return curves;
}

void Loop::harmonics(Hertz asked, LevelDbfs send) {
  const Curves curves = take("steady", asked, send, request_.integration);
  double fundamental = 0.0;
  for (const HarmonicPoint& p : curves.harmonics) {
    const double square = p.in_phase * p.in_phase + p.quadrature * p.quadrature;
    if (p.order == 1) fundamental = std::sqrt(square);
    if (p.order == 1 || p.flag == Flag::alias || !p.level) continue;
    // The noise adds 2 u^2 to the mean square of a line's amplitude; taken off, at least u remains.
    const double u2 = p.component_u * p.component_u;
    const double residual = std::sqrt(std::max(square - 2.0 * u2, u2));
    if (!(residual > 0.0)) continue;
    FloorPoint f;
    f.level = send;
    f.order = p.order;
    f.relative = Decibels::of_ratio(residual / fundamental);
    f.ret = LevelDbfs(20.0 * std::log10(fundamental));
    f.frequency = Hertz(p.frequency_hz);
    f.phase_deg = std::atan2(p.quadrature, p.in_phase) * 180.0 / std::numbers::pi;
    result_.floor.push_back(f);
  }
  if (!curves.levels.empty() && curves.levels.front().output && result_.gain == Decibels(0.0)) {
    result_.gain = LevelDbfs(*curves.levels.front().output) - send;
  }
}

void Loop::products(const std::string& method, LevelDbfs send) {
  const Curves curves = take(method, Hertz(0.0), send, request_.integration);
  for (const IntermodPoint& p : curves.intermods) {
    if (!p.db || p.flag == Flag::alias) continue;
    FloorPoint f;
    f.level = send;
    f.order = 0;
    f.product = method + " " + p.product;
    f.relative = Decibels(*p.db);  // under the noise: the upper limit
    f.ret = send + result_.gain;
    result_.floor.push_back(f);
  }
}

void Loop::response() {
  const LevelDbfs send = std::min(kResponseLevel, request_.ceiling);
  std::vector<LoopPoint> points;
  for (const ResponsePoint& p : take("sweep", Hertz(0.0), send, Seconds(0.0)).responses) {
    if (p.order != 1 || !p.magnitude_db || !p.phase_deg || p.flag != Flag::none) continue;
    double degrees = *p.phase_deg;
    if (!points.empty()) {  // without jumps of a turn, so that points can be joined by lines
      degrees = points.back().phase_deg + std::remainder(degrees - points.back().phase_deg, 360.0);
    }
    points.push_back({Hertz(p.frequency_hz), Decibels(*p.magnitude_db), degrees});
  }
  const LoopResponse absolute(points);
  const Decibels at_reference = Decibels::of_ratio(std::abs(absolute.loop(kReference)));
  for (LoopPoint& p : points) p.magnitude = p.magnitude - at_reference;
  result_.response = std::move(points);
}

// The two-tone methods whose tones need no plan.
std::vector<std::string> pairs() {
  std::vector<std::string> ids;
  for (const Method& m : methods()) {
    if (m.predict != nullptr && !m.needs.tones_required) ids.emplace_back(m.id);
  }
  return ids;
}

LoopResult Loop::measure() {
  const std::vector<LevelDbfs> levels = levels_below(request_.ceiling);
  const std::vector<std::string> methods = request_.products ? pairs() : std::vector<std::string>{};
  takes_ = static_cast<int>(levels.size() * (request_.frequencies.size() + methods.size())) +
           (request_.response ? 1 : 0);
  const Waveform chirp =
      chain_check_stimulus(rate_, chain_check_level(LevelDbfs(kLowest), request_.ceiling));
  const ChainCheck chain = judge_chain(chirp, {play(chirp, samples_in(Seconds(1.0), rate_))});
  delay_ = std::max(0.0, chain.delay);
  for (const LevelDbfs send : levels) {
    for (const Hertz f : request_.frequencies) harmonics(f, send);
    for (const std::string& method : methods) products(method, send);
  }
  if (request_.response) response();
  return std::move(result_);
}

}  // namespace

LoopResult measure_loop(Port& cable, const LoopRequest& request, Progress& progress) {
  return Loop(cable, request, progress).measure();
}

void add_loop(Rig& rig, const LoopResult& loop) {
  constexpr double kSamePath = 1.0;  // dB
  std::vector<FloorPoint> points = rig.floor.points();
  std::erase_if(points, [&](const FloorPoint& p) {
    const Decibels gain = p.return_level() - p.level;
    return std::abs((gain - loop.gain).value()) < kSamePath;
  });
  points.insert(points.end(), loop.floor.begin(), loop.floor.end());
  rig.floor = RigFloor(std::move(points));
  if (!loop.response.empty()) {
    rig.response = LoopResponse(loop.response, rig.response.return_share());
  }
}

}  // namespace kneeprint
