// SPDX-License-Identifier: GPL-3.0-or-later
// journal.jsonl: one line per event of a measurement, appended and flushed to the disk as it
// happens. First line: {"event":"begin", format, version, unit, seed, started, ...}; then one
// {"event":"take"} line per kept take; {"event":"stop"} lines with the reason when a run ends
// before the ladder does. Every line ends in its own checksum, "line_crc32", so that a changed line
// is found.
#pragma once

#include <cstdint>
#include <filesystem>
#include <string>
#include <vector>

namespace kneeprint {

struct JournalBegin {
  std::string unit;  ///< free text that the user gave
  std::uint64_t seed = 0;
  std::string started;  ///< UTC, ISO 8601
  std::string program;  ///< "kneeprint 0.1.0"
};

struct JournalTake {
  int number = 0;     ///< 000 is the chain check
  std::string file;   ///< relative to the folder: "takes/003-steady-997Hz-r4.wav"
  std::string crc32;  ///< of the file's bytes, 8 hex digits
  std::string method;
  double frequency_hz = 0.0;  ///< steady: as asked by the plan; else 0
  int rung = -1;              ///< index on the ladder, -1 for the chain check
  double send_dbfs = 0.0;
  double hold_s = 0.0;         ///< length of the steady part as played
  double delay_samples = 0.0;  ///< fraction left after the file was aligned to its stimulus
  int attempts = 1;            ///< plays needed (dropouts repeat a take)
  // How the seconds of sound were spent; 0 in journals that do not say.
  double sound_s = 0.0;        ///< of the stimulus, ramps and silence included
  double read_s = 0.0;         ///< of it, what the reading used
  double settling_s = 0.0;     ///< of that, left out of the averages
  double tail_s = 0.0;         ///< recorded after the stimulus, for the rig's delay
  double discarded_s = 0.0;    ///< earlier, shorter plays of this take
  std::string started, ended;  ///< UTC
  std::string guard;           ///< "" or the guard's reason
};

struct JournalStop {
  /// Stable id: "top", "thd", "compression", "ceiling", "return-hot", "guard", "cancelled",
  /// "device".
  std::string reason;
  std::string sentence;
  std::string at;  ///< UTC
};

struct Journal {
  JournalBegin begin;
  /// By number; a later line of the same number replaces an earlier.
  std::vector<JournalTake> takes;
  std::vector<JournalStop> stops;
};

/// Reads the journal. An unfinished last line (the process was killed while writing) is dropped,
/// and cut from the file when `repair` is set. Throws InputError naming file and line for anything
/// else, and for a newer format version.
Journal read_journal(const std::filesystem::path& file, bool repair);

/// One JSON line each, without the newline.
std::string journal_line(const JournalBegin& begin);
std::string journal_line(const JournalTake& take);
std::string journal_line(const JournalStop& stop);

}  // namespace kneeprint
