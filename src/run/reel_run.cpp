// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/reel_run.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "method/time_base.h"
#include "platform/os.h"
#include "print/checksum.h"
#include "print/folder.h"
#include "quantity/failure.h"
#include "rig/reel.h"
#include "run/schedule.h"
#include "signal/wav.h"

namespace kneeprint {
namespace {

// Everything about a reel follows from plan and rig.
struct ReelPlan {
  std::vector<TakeSpec> specs;
  ReelLayout layout;
};

ReelPlan reel_plan(const Plan& plan, const Rig& rig, LevelDbfs ceiling) {
  ReelPlan out;
  const Ladder ladder = ladder_of(plan, rig, ceiling);
  std::vector<std::size_t> lengths;
  const auto add = [&](const std::vector<TakeSpec>& specs) {
    for (const TakeSpec& spec : specs) {
      out.specs.push_back(spec);
      lengths.push_back(find_method(spec.method)->stimulus(spec, rig.rate).wave.samples.size());
    }
  };
  const int top = static_cast<int>(ladder.rungs.size()) - 1;
  const auto level = [&](int rung) { return ladder.rungs[static_cast<std::size_t>(rung)]; };
  add(takes_aside(plan, rig, Placement::before_ladder, level(0), 0));
  for (int rung = 0; rung <= top; ++rung) add(takes_of_rung(plan, rig, level(rung), rung));
  for (int rung = top - 1; plan.descend && rung >= 0; --rung) {
    add(takes_of_rung(plan, rig, level(rung), rung, true));
  }
  add(takes_aside(plan, rig, Placement::after_ladder, level(top), top));
  out.layout = lay_out(lengths, rig.rate);
  return out;
}

std::uint32_t code_of(const Plan& plan) {
  return static_cast<std::uint32_t>(std::stoul(crc32_hex(plan_json(plan)), nullptr, 16));
}

LevelDbfs marker_level(LevelDbfs ceiling) { return std::min(LevelDbfs(-20.0), ceiling); }

// The error that the tracker's own noise leaves in a speed that varies at 10 Hz.
double speed_error(const RecorderTime& time) {
  return 2.0 * std::numbers::pi * 10.0 * time.jitter.value();
}

std::string sentence(const RecorderRun& run) {
  const std::string speed = fmt::format("recorder: speed {:+.4f} %", 100.0 * run.speed);
  if (!run.flutter) return speed + ", no flutter found";
  return fmt::format("{}, flutter {:.2g} % peak (0.5 to 10 Hz)", speed, 100.0 * *run.flutter);
}

}  // namespace

Seconds write_reel(const MeasureRequest& request) {
  const LevelDbfs ceiling =
      ceiling_of(request.plan, request.rig, request.ceiling, request.has_rig_file);
  const ReelPlan reel = reel_plan(request.plan, request.rig, ceiling);
  PrintFolder folder(request.into);
  folder.begin(plan_json(request.plan), rig_json(request.rig),
               {request.unit, request.seed, os::utc_now(), "kneeprint"});
  std::vector<Waveform> stimuli;
  for (const TakeSpec& spec : reel.specs) {
    stimuli.push_back(find_method(spec.method)->stimulus(spec, request.rig.rate).wave);
  }
  const Waveform wave =
      assemble(reel.layout, stimuli, code_of(request.plan), marker_level(ceiling));
  std::filesystem::path part = folder.reel_wav();
  part += ".part";
  write_wav(part, {wave});
  os::publish(part, folder.reel_wav());
  return wave.duration();
}

RecorderRun ingest_reel(const std::filesystem::path& path, const std::filesystem::path& file,
                        int channel, Progress& progress) {
  PrintFolder folder(path);
  if (!folder.exists()) {
    throw InputError(fmt::format("{}: no kneeprint here (no journal.jsonl); write the reel first",
                                 path.string()));
  }
  const Plan plan =
      parse_plan(read_text(folder.plan_file()), folder.plan_file().string(), method_needs());
  Rig rig = read_rig(folder.rig_file());
  if (rig.kind != RigKind::reel) {
    throw InputError(
        fmt::format("{}: this kneeprint was measured directly, not by a reel", path.string()));
  }
  const std::vector<Waveform> channels = read_audio(file);
  if (channel > static_cast<int>(channels.size())) {
    throw InputError(fmt::format("{}: has {} channel(s), channel {} was asked for", file.string(),
                                 channels.size(), channel));
  }
  const Waveform& recording = channels[static_cast<std::size_t>(channel - 1)];
  const ReelPlan reel = reel_plan(plan, rig, ceiling_of(plan, rig, std::nullopt, true));
  const ReelFound found = find_reel(recording, reel.layout, file.string(), code_of(plan));
  progress.say(fmt::format("reel found {:.3f} s into the recording, {}, clock {:+.2f} ppm",
                           found.start / recording.rate.value(),
                           found.polarity > 0 ? "upright" : "inverted", found.clock_ppm));

  RecorderRun run;
  run.speed = 1.0 / (1.0 + 1e-6 * found.clock_ppm) - 1.0;
  rig.recorded_rate.reset();
  rig.marker_polarity.reset();
  if (recording.rate != rig.rate) rig.recorded_rate = recording.rate;
  os::write_whole(folder.rig_file(), rig_json(rig));
  const std::string now = os::utc_now();
  for (std::size_t i = 0; i < reel.specs.size(); ++i) {
    const TakeSpec& spec = reel.specs[i];
    JournalTake take;
    take.number = spec.number;
    take.method = spec.method;
    take.frequency_hz = spec.asked.value();
    take.rung = spec.rung;
    take.send_dbfs = spec.send.value();
    take.hold_s = spec.hold_blocks * find_method(spec.method)->block_length(spec, rig.rate).value();
    take.started = take.ended = now;
    const Stimulus stimulus = find_method(spec.method)->stimulus(spec, rig.rate);
    const Waveform response =
        cut(recording, found, reel.layout, reel.layout.slots[i], stimulus.wave);
    const std::vector<std::size_t> tones = steady_tones(stimulus);
    if (!tones.empty()) {
      const RecorderTime time = steady_time(response, stimulus.hold, tones).time;
      if (time.drifts && speed_error(time) < 0.1 * time.flutter) {
        run.flutter = std::max(run.flutter.value_or(0.0), time.flutter);
      }
    }
    folder.keep_take(take, {response});
  }
  // 0.01 % at 0.5 Hz moves a tone by 32 us: 11 degrees at 1 kHz. Beyond, its phase tells no
  // polarity.
  constexpr double kTellsNoPhase = 1e-4;
  if (run.flutter.value_or(0.0) > kTellsNoPhase) {
    rig.marker_polarity = found.polarity;
    os::write_whole(folder.rig_file(), rig_json(rig));
  }
  progress.say(sentence(run));
  return run;
}

}  // namespace kneeprint
