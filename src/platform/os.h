// SPDX-License-Identifier: GPL-3.0-or-later
// What the C++ standard library lacks, in the one file that knows the operating system.
#pragma once

#include <filesystem>
#include <string>
#include <string_view>

namespace kneeprint::os {

/// Writes to FILE.part, flushes to the disk, renames to FILE, flushes the folder: FILE is whole or
/// absent. Throws InputError naming the file and the system's reason.
void write_whole(const std::filesystem::path& file, std::string_view bytes);
/// Flushes an already written FILE.part to the disk and names it FILE.
void publish(const std::filesystem::path& part, const std::filesystem::path& file);
/// Appends and flushes to the disk.
void append_line(const std::filesystem::path& file, std::string_view line);

bool is_terminal(int stream);  ///< 1 stdout, 2 stderr

/// While it lives, what the process prints on stderr (drivers' chatter) goes nowhere.
class QuietStderr {
 public:
  QuietStderr();
  ~QuietStderr();
  QuietStderr(const QuietStderr&) = delete;
  QuietStderr& operator=(const QuietStderr&) = delete;

 private:
  int saved_ = -1;
};

/// Ctrl-C and termination set a flag instead of killing the process while audio runs.
void catch_interrupts();
bool interrupted();

/// What is freed stays with the process (up to 256 MiB) instead of going back to the system: arrays
/// that are made anew for every take would cost more to be given than to be filled.
void keep_freed_memory();

std::string utc_now();  ///< ISO 8601, seconds

}  // namespace kneeprint::os
