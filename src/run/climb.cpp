// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <chrono>
#include <cmath>
#include <map>
#include <thread>

#include "platform/os.h"
#include "print/folder.h"
#include "quantity/failure.h"
#include "run/chain_check.h"
#include "run/continuity.h"
#include "run/measure.h"
#include "run/take_reading.h"

namespace kneeprint {
namespace {

constexpr int kMostAttempts = 3;
constexpr LevelDbfs kReturnRoom{
    -0.5};  // the next rung is not played when it would come back hotter
constexpr Seconds kUnknownLatency{1.0};      // recorded after the chain check's chirp
constexpr Seconds kAfterTake{0.05};          // and after each take, beyond the known delay
constexpr Seconds kSamePlace{0.0075};        // one and a half chunks of the continuity check
constexpr double kLargestClockOffset = 0.2;  // ppm

std::vector<Waveform> channels_of(const Player& player, Hertz rate) {
  std::vector<Waveform> out;
  out.push_back({rate, {player.returned().begin(), player.returned().end()}});
  if (!player.reference().empty()) {
    out.push_back({rate, {player.reference().begin(), player.reference().end()}});
  }
  return out;
}

// The part of a recording that answers the stimulus, aligned to the nearest sample.
std::vector<Waveform> aligned(std::vector<Waveform> recorded, long delay, std::size_t length) {
  for (Waveform& w : recorded) {
    std::vector<double> cut(length, 0.0);
    for (std::size_t n = 0; n < length; ++n) {
      const long from = static_cast<long>(n) + delay;
      if (from >= 0 && from < static_cast<long>(w.samples.size())) {
        cut[n] = w.samples[static_cast<std::size_t>(from)];
      }
    }
    w.samples = std::move(cut);
  }
  return recorded;
}

double peak_dbfs(const Waveform& w) {
  double peak = 1e-12;
  for (const double x : w.samples) peak = std::max(peak, std::abs(x));
  return 20.0 * std::log10(peak);
}

class Climb {
 public:
  Climb(const MeasureRequest& request, Port& port, Progress& progress)
      : request_(request),
        port_(port),
        progress_(progress),
        folder_(request.into),
        ceiling_(ceiling_of(request.plan, request.rig, request.ceiling, request.has_rig_file)),
        ladder_(ladder_of(request.plan, request.rig, ceiling_)),
        guard_({ceiling_, LevelDbfs(-0.1), Seconds(0.003)}, request.rig.rate) {}

  ClimbEnd run();

 private:
  void open_folder();
  void warm_up();
  void check_chain();
  TakeVerdict take(const TakeSpec& first);
  TakeVerdict play(const TakeSpec& spec, std::vector<Waveform>& response, JournalTake& kept);
  std::vector<Waveform> record(const Waveform& stimulus, std::size_t tail, int number);
  void announce(const TakeSpec& spec);
  std::optional<ClimbEnd> climb_up(std::size_t& highest);
  void play_all(const std::vector<TakeSpec>& specs);
  std::optional<ClimbEnd> plan_says_stop(const TakeSpec& spec, const TakeVerdict& verdict);
  ClimbEnd finish(ClimbEnd end);
  std::string drive_text(LevelDbfs send) const;
  Seconds duration_of(const TakeSpec& spec);
  void plan_duration();

  const MeasureRequest& request_;
  Port& port_;
  Progress& progress_;
  PrintFolder folder_;
  LevelDbfs ceiling_;
  Ladder ladder_;
  Guard guard_;
  Journal kept_;
  ChainCheck chain_;
  double return_peak_ = -240.0;                // dBFS, of the hottest take so far
  std::map<std::string, double> lowest_gain_;  // dB, by what is played
  std::map<std::string, int> next_hold_;       // blocks that the rung below needed
  std::map<std::string, Seconds> durations_;
  int takes_ = 0, begun_ = 0;
  Seconds left_{0.0};
};

struct Cancelled {};

// What is played, whatever its level.
std::string kind_of(const TakeSpec& spec) {
  std::string kind = fmt::format("{} {:g} Hz", spec.method, spec.asked.value());
  for (const Hertz f : spec.options.tones) kind += fmt::format(" {:g}", f.value());
  return kind;
}

std::string Climb::drive_text(LevelDbfs send) const {
  const LevelScale scale = view_of(request_.rig).send;
  return fmt::format("{:.1f} {}", scale.level_of(send), name(scale.unit));
}

void Climb::open_folder() {
  const std::string plan = plan_json(request_.plan), rig = rig_json(request_.rig);
  // A run that was killed while it began left no journal: then there is nothing to go on with yet.
  if (!request_.resume || !folder_.exists()) {
    folder_.begin(plan, rig, {request_.unit, request_.seed, os::utc_now(), "kneeprint"});
    return;
  }
  if (read_text(folder_.plan_file()) != plan || read_text(folder_.rig_file()) != rig) {
    throw InputError(
        fmt::format("{}: the plan or the rig differs from the one this measurement was begun with; "
                    "resume with the "
                    "same --plan and rig options",
                    folder_.path().string()));
  }
  kept_ = read_journal(folder_.journal_file(), true);
  // A take whose file is missing or damaged is taken again.
  std::erase_if(kept_.takes, [&](const JournalTake& t) {
    try {
      folder_.load_take(t);
      return false;
    } catch (const InputError& e) {
      progress_.say(fmt::format("{} The take is made again.", e.what()));
      return true;
    }
  });
}

// Idle time for gear that drifts while it warms; a virtual unit has none to wait for.
void Climb::warm_up() {
  if (!port_.info().live) return;
  using Clock = std::chrono::steady_clock;
  const auto end = Clock::now() + std::chrono::duration<double>(request_.plan.warm_up.value());
  if (Clock::now() < end) {
    progress_.say(
        fmt::format("warming up for {:g} s, as the plan asks", request_.plan.warm_up.value()));
  }
  while (Clock::now() < end && !os::interrupted()) {
    std::this_thread::sleep_for(std::chrono::milliseconds(50));
  }
}

std::vector<Waveform> Climb::record(const Waveform& stimulus, std::size_t tail, int number) {
  Player player(stimulus, tail, port_.info().has_reference, guard_);
  port_.play(player, number);
  if (guard_.reason() != GuardReason::none) throw GuardStop(sentence(guard_.reason()));
  if (player.dropouts() > 0) return {};
  return channels_of(player, request_.rig.rate);
}

void Climb::check_chain() {
  const Waveform chirp =
      chain_check_stimulus(request_.rig.rate, chain_check_level(ladder_.rungs.front(), ceiling_));
  std::vector<Waveform> recorded;
  for (int attempt = 1; recorded.empty(); ++attempt) {
    if (attempt > kMostAttempts) {
      throw DeviceError(
          "chain check: the audio driver lost frames three times in a row. Use a larger buffer, "
          "close "
          "other programs, then start again.");
    }
    recorded = record(chirp, samples_in(kUnknownLatency, request_.rig.rate), 0);
  }
  chain_ = judge_chain(chirp, recorded);
  progress_.say(chain_.sentence);
  JournalTake line;
  line.method = "chain-check";
  line.send_dbfs = peak_dbfs(chirp);
  line.delay_samples = chain_.delay;
  line.started = line.ended = os::utc_now();
  folder_.keep_take(line, recorded);
}

Seconds Climb::duration_of(const TakeSpec& spec) {
  const std::string kind = kind_of(spec);
  if (!durations_.contains(kind)) {
    durations_[kind] = find_method(spec.method)->stimulus(spec, request_.rig.rate).wave.duration();
  }
  return durations_[kind];
}

void Climb::plan_duration() {
  const auto add = [&](const std::vector<TakeSpec>& specs) {
    for (const TakeSpec& spec : specs) left_ = left_ + duration_of(spec);
    takes_ += static_cast<int>(specs.size());
  };
  const auto& rungs = ladder_.rungs;
  const int top = static_cast<int>(rungs.size()) - 1;
  add(takes_aside(request_.plan, request_.rig, Placement::before_ladder, rungs.front(), 0));
  for (int rung = 0; rung <= top; ++rung) {
    const LevelDbfs send = rungs[static_cast<std::size_t>(rung)];
    add(takes_of_rung(request_.plan, request_.rig, send, rung));
    if (request_.plan.descend && rung < top) {
      add(takes_of_rung(request_.plan, request_.rig, send, rung, true));
    }
  }
  add(takes_aside(request_.plan, request_.rig, Placement::after_ladder, rungs.back(), top));
}

void Climb::announce(const TakeSpec& spec) {
  ProgressStep step;
  step.take = begun_;
  step.takes = takes_;
  step.what = spec.asked.value() > 0.0 ? fmt::format("{} {:g} Hz", spec.method, spec.asked.value())
                                       : spec.method;
  step.drive = drive_text(spec.send);
  step.left = left_;
  progress_.step(step);
}

// Plays until a take is whole: at most three times when the driver or the take itself shows a loss.
TakeVerdict Climb::play(const TakeSpec& spec, std::vector<Waveform>& response, JournalTake& kept) {
  const int number = spec.number;
  const Hertz rate = request_.rig.rate;
  const Stimulus stimulus = find_method(spec.method)->stimulus(spec, rate);
  const long delay = std::lround(chain_.delay);
  const std::size_t tail =
      static_cast<std::size_t>(std::max(0L, delay)) + samples_in(kAfterTake, rate);
  double jumped_at = -1.0;
  kept.discarded_s += kept.sound_s;
  kept.sound_s = stimulus.wave.duration().value();
  kept.read_s = stimulus.read_length().value();
  kept.tail_s = static_cast<double>(tail) / rate.value();
  for (kept.attempts = 1; kept.attempts <= kMostAttempts; ++kept.attempts) {
    std::vector<Waveform> recorded = record(stimulus.wave, tail, number);
    if (recorded.empty()) {
      progress_.say(fmt::format("take {}: the driver lost frames; it is made again", number));
      continue;
    }
    response = aligned(std::move(recorded), delay, stimulus.wave.samples.size());
    const Continuity c = check_continuity(response.front(), stimulus.hold);
    // Frames are not lost twice at the same place: an edge that comes again is the unit's own
    // doing.
    if (c.jumped && std::abs(c.at_s - jumped_at) > kSamePlace.value()) {
      jumped_at = c.at_s;
      progress_.say(
          fmt::format("take {}: frames were lost or repeated near {:.2f} s without a word from the "
                      "driver; it is "
                      "made again",
                      number, c.at_s));
      continue;
    }
    if (port_.info().live && std::abs(c.clock_ppm) > kLargestClockOffset) {
      throw DeviceError(
          fmt::format("take {}: send and return run on different clocks, {:+.2f} ppm apart. Use "
                      "one interface for "
                      "both, or lock them to one word clock.",
                      number, c.clock_ppm));
    }
    Curves unused;
    const TakeData data{response.front(), response.size() > 1 ? &response[1] : nullptr,
                        chain_.delay - static_cast<double>(delay)};
    return find_method(spec.method)->read(spec, data, view_of(request_.rig), unused);
  }
  throw DeviceError(fmt::format(
      "take {}: the audio device lost frames {} times in a row. Use a larger buffer, close other "
      "programs, check the clock source; then go on with --resume.",
      number, kMostAttempts));
}

// Blocks for the next attempt: a unit that has not settled gets twice the time, one that has as
// much as its uncertainty still lacks.
int longer_hold(int blocks, const TakeVerdict& verdict, int most) {
  const double factor = !verdict.settled ? 2.0 : std::max(1.0, verdict.longer.value_or(1.0));
  const double wanted = std::ceil(blocks * factor - 1e-9);
  return wanted >= most ? most : static_cast<int>(wanted);
}

TakeVerdict Climb::take(const TakeSpec& first) {
  ++begun_;
  const std::string kind = kind_of(first);
  const Method& method = *find_method(first.method);
  const Seconds block = method.block_length(first, request_.rig.rate);
  const int most = std::max(
      first.hold_blocks,
      static_cast<int>(std::floor(request_.plan.settle_limit.value() / block.value() + 1e-9)));
  const Seconds planned = duration_of(first);
  TakeVerdict verdict;
  int played = 0;
  const auto line = std::find_if(kept_.takes.begin(), kept_.takes.end(),
                                 [&](const JournalTake& t) { return t.number == first.number; });
  if (line != kept_.takes.end()) {
    Curves unused;
    return_peak_ = std::max(return_peak_, peak_dbfs(folder_.load_take(*line).front()));
    verdict = read_take(folder_, *line, request_.plan, request_.rig, unused);
    played = static_cast<int>(std::lround(line->hold_s / block.value()));
  } else {
    TakeSpec spec = first;
    // The rung below says how long this one will need: harmonics grow with drive, noise does not.
    if (const auto it = next_hold_.find(kind); it != next_hold_.end()) {
      spec.hold_blocks = std::clamp(it->second, first.hold_blocks, most);
    }
    JournalTake kept;
    kept.started = os::utc_now();
    std::vector<Waveform> response;
    while (true) {
      announce(spec);
      verdict = play(spec, response, kept);
      const int next = longer_hold(spec.hold_blocks, verdict, most);
      if (next <= spec.hold_blocks) break;
      spec.hold_blocks = next;
    }
    played = spec.hold_blocks;
    kept.number = spec.number;
    kept.method = spec.method;
    kept.frequency_hz = spec.asked.value();
    kept.rung = spec.rung;
    kept.send_dbfs = spec.send.value();
    kept.hold_s = spec.hold_blocks * block.value();
    kept.settling_s = verdict.settling.value();
    kept.delay_samples = chain_.delay - static_cast<double>(std::lround(chain_.delay));
    kept.ended = os::utc_now();
    return_peak_ = std::max(return_peak_, peak_dbfs(response.front()));
    folder_.keep_take(kept, response);
  }
  // Less is tried when the rung below reached its uncertainty with time to spare.
  if (verdict.settled && verdict.longer) {
    next_hold_[kind] = static_cast<int>(std::ceil(played * *verdict.longer - 1e-9));
  }
  left_ = std::max(Seconds(0.0), left_ - planned);
  return verdict;
}

std::optional<ClimbEnd> Climb::plan_says_stop(const TakeSpec& spec, const TakeVerdict& verdict) {
  const Plan& plan = request_.plan;
  if (plan.stop_thd_f_percent && verdict.thd_f_percent &&
      *verdict.thd_f_percent >= *plan.stop_thd_f_percent) {
    return ClimbEnd{
        "thd",
        fmt::format("the ladder ends at {}: THD_F has reached {:.3g} % (the plan stops at {:g} %)",
                    drive_text(spec.send), *verdict.thd_f_percent, *plan.stop_thd_f_percent),
        false};
  }
  if (!verdict.output_level) return std::nullopt;
  const double gain = *verdict.output_level - spec.send.value();
  const double lowest = lowest_gain_.try_emplace(kind_of(spec), gain).first->second;
  if (plan.stop_compression && lowest - gain >= plan.stop_compression->value()) {
    return ClimbEnd{
        "compression",
        fmt::format("the ladder ends at {}: compression has reached {:.2f} dB (the plan stops at "
                    "{:g} dB)",
                    drive_text(spec.send), lowest - gain, plan.stop_compression->value()),
        false};
  }
  return std::nullopt;
}

ClimbEnd Climb::finish(ClimbEnd end) {
  if (!end.stop.empty()) {
    progress_.say(end.sentence);
    folder_.keep_stop({end.stop, end.sentence, os::utc_now()});
  }
  return end;
}

void Climb::play_all(const std::vector<TakeSpec>& specs) {
  for (const TakeSpec& spec : specs) {
    if (os::interrupted()) throw Cancelled{};
    take(spec);
  }
}

// Rung by rung until the top, or until the return would be too hot or the plan has seen enough.
std::optional<ClimbEnd> Climb::climb_up(std::size_t& highest) {
  for (std::size_t rung = 0; rung < ladder_.rungs.size(); ++rung) {
    const LevelDbfs send = ladder_.rungs[rung];
    if (rung > 0) {
      const LevelDbfs expected = LevelDbfs(return_peak_) + (send - ladder_.rungs[rung - 1]);
      if (expected > kReturnRoom) {
        return ClimbEnd{
            "return-hot",
            fmt::format("stopped below {}: the return would reach {:.1f} dBFS. Turn the "
                        "input gain down or put a pad before the return to go further.",
                        drive_text(send), expected.value()),
            true};
      }
    }
    std::optional<ClimbEnd> end;
    for (const TakeSpec& spec :
         takes_of_rung(request_.plan, request_.rig, send, static_cast<int>(rung))) {
      if (os::interrupted()) throw Cancelled{};
      const TakeVerdict verdict = take(spec);
      if (!end) end = plan_says_stop(spec, verdict);
    }
    highest = rung;
    const bool at_top = rung + 1 == ladder_.rungs.size();  // nothing is left to stop
    if (end && !at_top) return end;
  }
  return std::nullopt;
}

ClimbEnd Climb::run() {
  open_folder();
  std::optional<ClimbEnd> end;
  try {
    warm_up();
    check_chain();
    plan_duration();
    const Plan& plan = request_.plan;
    play_all(takes_aside(plan, request_.rig, Placement::before_ladder, ladder_.rungs.front(), 0));
    std::size_t highest = 0;
    end = climb_up(highest);
    if (end && end->by_guard) return finish(*end);
    for (std::size_t rung = highest; plan.descend && rung-- > 0;) {
      play_all(
          takes_of_rung(plan, request_.rig, ladder_.rungs[rung], static_cast<int>(rung), true));
    }
    play_all(takes_aside(plan, request_.rig, Placement::after_ladder, ladder_.rungs[highest],
                         static_cast<int>(highest)));
  } catch (const Cancelled&) {
    return finish(
        {"cancelled", "stopped by hand; what was taken is kept (--resume goes on)", true});
  } catch (const GuardStop& stop) {
    return finish(
        {guard_.reason() == GuardReason::none ? "return-hot" : std::string(name(guard_.reason())),
         stop.what(), true});
  } catch (const Failure& failure) {
    folder_.keep_stop({"device", failure.what(), os::utc_now()});
    throw;
  }
  if (end) return finish(*end);
  if (ladder_.cut_by_ceiling) {
    return finish({"ceiling",
                   fmt::format("the ladder ends at the ceiling of {}", drive_text(ceiling_)),
                   false});
  }
  return {};
}

}  // namespace

ClimbEnd climb(const MeasureRequest& request, Port& port, Progress& progress) {
  return Climb(request, port, progress).run();
}

}  // namespace kneeprint
