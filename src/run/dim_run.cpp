// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/dim_run.h"

#include <fmt/format.h>

#include <cmath>

#include "platform/os.h"
#include "quantity/failure.h"
#include "signal/wav.h"

namespace kneeprint {
namespace {

// Far above any number that a plan's takes reach.
int number_of(DimKind kind) { return kind == DimKind::dim30 ? 999030 : 999100; }

}  // namespace

void ingest_dim(const std::filesystem::path& path, const std::filesystem::path& file, int channel,
                DimKind kind, Progress& progress) {
  PrintFolder folder(path);
  if (!folder.exists()) {
    throw InputError(
        fmt::format("{}: no kneeprint here (no journal.jsonl); measure the unit, or "
                    "write a reel, first",
                    path.string()));
  }
  const std::vector<Waveform> channels = read_audio(file);
  if (channel > static_cast<int>(channels.size())) {
    throw InputError(fmt::format("{}: has {} channel(s), channel {} was asked for", file.string(),
                                 channels.size(), channel));
  }
  const Waveform& recording = channels[static_cast<std::size_t>(channel - 1)];
  const DimReading reading = read_dim(recording, kind, file.string());
  progress.say(
      fmt::format("{}: {} {:.4g} %, square {:.2f} Hz, sine {:.2f} Hz, {:.1f} s read; square over "
                  "sine {:+.2f} dB "
                  "of nominal",
                  name(kind), reading.figure.flag == Flag::noise ? "at most" : "reads",
                  100.0 * reading.figure.ratio, reading.square_hz.value, reading.sine_hz.value,
                  reading.length.value(),
                  20.0 * std::log10(reading.square_over_sine.value / reading.nominal_over_sine)));
  JournalTake take;
  take.number = number_of(kind);
  take.method = name(kind);
  take.started = take.ended = os::utc_now();
  folder.keep_take(take, {recording});
}

void read_dim_takes(const PrintFolder& folder, const Journal& journal, Curves& out) {
  for (const JournalTake& take : journal.takes) {
    const std::optional<DimKind> kind = dim_kind_named(take.method);
    if (!kind) continue;
    for (ScalarPoint& row :
         scalars_of(read_dim(folder.load_take(take).front(), *kind, take.file))) {
      out.scalars.push_back(std::move(row));
    }
  }
}

}  // namespace kneeprint
