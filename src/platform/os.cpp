// SPDX-License-Identifier: GPL-3.0-or-later
#include "platform/os.h"

#include <fcntl.h>
#include <fmt/format.h>
#include <malloc.h>
#include <unistd.h>

#include <atomic>
#include <cerrno>
#include <chrono>
#include <csignal>
#include <cstdio>
#include <cstring>
#include <ctime>

#include "quantity/failure.h"

namespace kneeprint::os {
namespace {

[[noreturn]] void fail(const std::filesystem::path& file, const char* what) {
  throw InputError(fmt::format("{}: {}: {}", file.string(), what, std::strerror(errno)));
}

// A file descriptor that closes itself.
class File {
 public:
  File(const std::filesystem::path& path, int flags)
      : path_(path), fd_(open(path.c_str(), flags, 0644)) {
    if (fd_ < 0) fail(path_, "cannot be opened");
  }
  ~File() { close(fd_); }
  File(const File&) = delete;
  File& operator=(const File&) = delete;

  void write_all(std::string_view bytes) {
    while (!bytes.empty()) {
      const ssize_t n = write(fd_, bytes.data(), bytes.size());
      if (n < 0 && errno == EINTR) continue;
      if (n < 0) fail(path_, "cannot be written");
      bytes.remove_prefix(static_cast<std::size_t>(n));
    }
  }
  void flush() {
    if (fsync(fd_) != 0) fail(path_, "cannot be flushed to the disk");
  }
  // Some network and FUSE file systems flush files but know no flush of folders.
  void flush_if_possible() {
    if (fsync(fd_) != 0 && errno != EINVAL) fail(path_, "cannot be flushed to the disk");
  }

 private:
  std::filesystem::path path_;
  int fd_;
};

std::filesystem::path folder_of(const std::filesystem::path& file) {
  return file.has_parent_path() ? file.parent_path() : std::filesystem::path(".");
}

// A new name is safe only when the folder that holds it is on the disk too.
void flush_folder(const std::filesystem::path& folder) {
  File(folder, O_RDONLY | O_DIRECTORY).flush_if_possible();
}

std::atomic<bool> interrupt_seen{false};
static_assert(std::atomic<bool>::is_always_lock_free, "set from a signal handler");

}  // namespace

void write_whole(const std::filesystem::path& file, std::string_view bytes) {
  std::filesystem::path part = file;
  part += ".part";
  {
    File f(part, O_WRONLY | O_CREAT | O_TRUNC);
    f.write_all(bytes);
  }
  publish(part, file);
}

void publish(const std::filesystem::path& part, const std::filesystem::path& file) {
  File(part, O_RDONLY).flush();
  if (std::rename(part.c_str(), file.c_str()) != 0) fail(file, "cannot be named");
  flush_folder(folder_of(file));
}

void append_line(const std::filesystem::path& file, std::string_view line) {
  File f(file, O_WRONLY | O_CREAT | O_APPEND);
  f.write_all(std::string(line) + '\n');
  f.flush();
}

bool is_terminal(int stream) { return isatty(stream) == 1; }

QuietStderr::QuietStderr() {
  std::fflush(stderr);
  saved_ = dup(2);
  const int nowhere = open("/dev/null", O_WRONLY);
  if (nowhere >= 0) {
    dup2(nowhere, 2);
    close(nowhere);
  }
}

QuietStderr::~QuietStderr() {
  if (saved_ < 0) return;
  std::fflush(stderr);
  dup2(saved_, 2);
  close(saved_);
}

void catch_interrupts() {
  struct sigaction action {};
  action.sa_handler = [](int) { interrupt_seen.store(true); };
  action.sa_flags = SA_RESTART;  // a take being written is written on
  sigaction(SIGINT, &action, nullptr);
  sigaction(SIGTERM, &action, nullptr);
}

bool interrupted() { return interrupt_seen.load(); }

void keep_freed_memory() {
#ifdef __GLIBC__
  mallopt(M_MMAP_THRESHOLD, 32 << 20);
  mallopt(M_TRIM_THRESHOLD, 256 << 20);
#endif
}

std::string utc_now() {
  const std::time_t now = std::chrono::system_clock::to_time_t(std::chrono::system_clock::now());
  std::tm utc{};
  gmtime_r(&now, &utc);
  return fmt::format("{:04}-{:02}-{:02}T{:02}:{:02}:{:02}Z", utc.tm_year + 1900, utc.tm_mon + 1,
                     utc.tm_mday, utc.tm_hour, utc.tm_min, utc.tm_sec);
}

}  // namespace kneeprint::os
