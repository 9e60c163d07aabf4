// SPDX-License-Identifier: GPL-3.0-or-later
// The folder a measurement leaves: where each file stands, takes written whole and checked.
#pragma once

#include <filesystem>
#include <string>
#include <vector>

#include "platform/read_text.h"
#include "print/journal.h"
#include "print/plan.h"
#include "signal/waveform.h"

namespace kneeprint {

class PrintFolder {
 public:
  /// Only names the folder; touches nothing.
  explicit PrintFolder(std::filesystem::path path);

  std::filesystem::path path() const { return path_; }
  std::filesystem::path plan_file() const { return path_ / "plan.json"; }
  std::filesystem::path rig_file() const { return path_ / "rig.json"; }
  std::filesystem::path journal_file() const { return path_ / "journal.jsonl"; }
  std::filesystem::path curves() const { return path_ / "curves"; }
  std::filesystem::path model_file() const { return path_ / "model.json"; }
  std::filesystem::path report_html() const { return path_ / "report.html"; }
  std::filesystem::path report_pdf() const { return path_ / "report.pdf"; }
  std::filesystem::path reel_wav() const { return path_ / "reel.wav"; }

  /// Holds a measurement: a journal, the last file that begin() writes. (A plan.json alone is a
  /// begin() that was killed; it may be begun again.)
  bool exists() const;

  /// Creates the folders and writes plan, rig and the journal's first line. Throws InputError when
  /// the folder already holds a measurement, or cannot be written (names it and the reason).
  void begin(const std::string& plan_json, const std::string& rig_json, const JournalBegin& first);

  /// Writes the take whole (part file, flush, rename), then its journal line with the checksum.
  /// Fills take.file and take.crc32. `channels`: the unit's return, then the reference if there is
  /// one.
  void keep_take(JournalTake& take, const std::vector<Waveform>& channels);
  void keep_stop(const JournalStop& stop);

  /// The take's channels. Throws InputError when the file is missing or its checksum is wrong.
  std::vector<Waveform> load_take(const JournalTake& take) const;

  /// Whole-file write of a result (curves, model, report). `file` stands in the folder.
  void write_result(const std::filesystem::path& file, const std::string& bytes) const;

 private:
  std::filesystem::path path_;
};

}  // namespace kneeprint
