// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/take_reading.h"

#include <fmt/format.h>

#include <cmath>

#include "curve/hysteresis.h"
#include "curve/stability.h"
#include "curve/upright.h"
#include "platform/os.h"
#include "quantity/failure.h"
#include "run/dim_run.h"
#include "run/in_order.h"

namespace kneeprint {

TakeSpec spec_of(const JournalTake& take, const Plan& plan, const Rig& rig) {
  std::optional<TakeSpec> spec =
      take_by_number(plan, rig, take.number, LevelDbfs(take.send_dbfs), take.rung);
  if (!spec || spec->method != take.method || spec->asked.value() != take.frequency_hz) {
    throw InputError(
        fmt::format("journal.jsonl: take {} ({}, {} Hz) is not one of the plan's: plan.json was "
                    "changed after the "
                    "measurement; put the original back",
                    take.number, take.method, take.frequency_hz));
  }
  const Seconds block = find_method(spec->method)->block_length(*spec, rig.rate);
  spec->hold_blocks = static_cast<int>(std::lround(take.hold_s / block.value()));
  return *spec;
}

namespace {

TakeVerdict read_seen(const PrintFolder& folder, const JournalTake& take, const Plan& plan,
                      const Rig& rig, const RigView& view, Curves& out) {
  const TakeSpec spec = spec_of(take, plan, rig);
  const Method& method = *find_method(spec.method);
  const std::vector<Waveform> channels = folder.load_take(take);
  const std::size_t expected = method.length != nullptr
                                   ? method.length(spec, rig.rate)
                                   : method.stimulus(spec, rig.rate).wave.samples.size();
  for (const Waveform& channel : channels) {
    if (channel.samples.size() != expected || channel.rate != rig.rate) {
      throw InputError(fmt::format("{}: {} frames at {} Hz, expected {} at {} Hz", take.file,
                                   channel.samples.size(), channel.rate.value(), expected,
                                   rig.rate.value()));
    }
  }
  const TakeData data{channels.front(), channels.size() > 1 ? &channels[1] : nullptr,
                      take.delay_samples};
  return method.read(spec, data, view, out);
}

}  // namespace

TakeVerdict read_take(const PrintFolder& folder, const JournalTake& take, const Plan& plan,
                      const Rig& rig, Curves& out) {
  return read_seen(folder, take, plan, rig, view_of(rig), out);
}

Curves read_takes(const PrintFolder& folder, const Journal& journal, const Plan& plan,
                  const Rig& rig) {
  std::vector<const JournalTake*> takes;
  for (const JournalTake& take : journal.takes) {
    if (take.rung >= 0) takes.push_back(&take);
  }
  os::keep_freed_memory();
  const RigView view = view_of(rig);
  Curves curves;
  // A worker holds one take at a time: it is loaded, read and dropped.
  const auto read = [&](std::size_t i) {
    Curves of_take;
    read_seen(folder, *takes[i], plan, rig, view, of_take);
    return of_take;
  };
  in_order(takes.size(), workers_for(takes.size()), read,
           [&](Curves&& of_take) { curves.append(std::move(of_take)); });
  read_dim_takes(folder, journal, curves);
  if (curves.empty()) {
    throw NothingUsable(fmt::format(
        "{}: no take of the ladder was kept, so there is nothing to read", folder.path().string()));
  }
  make_upright(curves, polarity_of(curves, plan));
  if (!view_of(rig).gain_known) make_relative(curves, fit_frequency(plan));
  add_hysteresis(curves);
  add_drift(curves);
  return curves;
}

int polarity_of(const Curves& curves, const Plan& plan) {
  return stated_polarity(curves, fit_frequency(plan));
}

}  // namespace kneeprint
