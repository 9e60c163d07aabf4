// SPDX-License-Identifier: GPL-3.0-or-later
#include "print/folder.h"

#include <fmt/format.h>

#include <system_error>

#include "platform/os.h"
#include "platform/read_text.h"
#include "print/checksum.h"
#include "quantity/failure.h"
#include "signal/wav.h"

namespace kneeprint {
namespace {

namespace fs = std::filesystem;

void create_folder(const fs::path& folder) {
  std::error_code failed;
  fs::create_directories(folder, failed);
  if (!failed && !fs::is_directory(folder, failed)) {
    failed = std::make_error_code(std::errc::not_a_directory);
  }
  if (failed) {
    throw InputError(
        fmt::format("{}: the folder cannot be created: {}; expected a place that can "
                    "be written",
                    folder.string(), failed.message()));
  }
}

/// "takes/003-steady-997Hz-r4.wav": the number sorts, the rest is for people.
std::string file_name(const JournalTake& take) {
  std::string name = fmt::format("takes/{:03}-{}", take.number, take.method);
  if (take.frequency_hz > 0.0) name += fmt::format("-{}Hz", take.frequency_hz);
  if (take.rung >= 0) name += fmt::format("-r{}", take.rung);
  return name + ".wav";
}

}  // namespace

PrintFolder::PrintFolder(fs::path path) : path_(std::move(path)) {}

bool PrintFolder::exists() const {
  std::error_code absent;
  return fs::exists(journal_file(), absent);
}

void PrintFolder::begin(const std::string& plan_json, const std::string& rig_json,
                        const JournalBegin& first) {
  if (exists()) {
    throw InputError(
        fmt::format("{}: already holds a measurement ({}); expected a new or empty folder",
                    path_.string(), journal_file().filename().string()));
  }
  create_folder(path_ / "takes");
  create_folder(curves());
  os::write_whole(plan_file(), plan_json);
  os::write_whole(rig_file(), rig_json);
  // Last and whole: a folder with a journal has everything that comes before it.
  os::write_whole(journal_file(), journal_line(first) + "\n");
}

void PrintFolder::keep_take(JournalTake& take, const std::vector<Waveform>& channels) {
  take.file = file_name(take);
  const fs::path file = path_ / take.file;
  fs::path part = file;
  part += ".part";
  write_wav(part, channels);
  take.crc32 = crc32_hex(read_text(part));
  os::publish(part, file);
  os::append_line(journal_file(), journal_line(take));
}

void PrintFolder::keep_stop(const JournalStop& stop) {
  os::append_line(journal_file(), journal_line(stop));
}

std::vector<Waveform> PrintFolder::load_take(const JournalTake& take) const {
  const fs::path file = path_ / take.file;
  if (const std::string found = crc32_hex(read_text(file)); found != take.crc32) {
    throw InputError(fmt::format(
        "{}: found the checksum {}; expected {}, which the journal states for take {} (the file "
        "was changed or damaged)",
        file.string(), found, take.crc32, take.number));
  }
  return read_audio(file);
}

void PrintFolder::write_result(const fs::path& file, const std::string& bytes) const {
  create_folder(file.parent_path());
  os::write_whole(file, bytes);
}

}  // namespace kneeprint
