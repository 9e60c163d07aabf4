// SPDX-License-Identifier: GPL-3.0-or-later
#include "platform/os.h"

#include <doctest/doctest.h>

#include <csignal>
#include <cstdio>
#include <regex>

#include "quantity/failure.h"
#include "temporary_folder.h"

namespace kneeprint {
namespace {

using testing::bytes_of;
using testing::TemporaryFolder;
using testing::write_bytes;

}  // namespace

TEST_CASE("a file is written whole, replaces an older one, and leaves no .part behind") {
  const TemporaryFolder folder;
  const auto file = folder.path() / "plan.json";
  std::string bytes = "first";
  os::write_whole(file, bytes);
  CHECK(bytes_of(file) == bytes);
  bytes.assign(300000, 'x');
  bytes[1000] = '\0';
  os::write_whole(file, bytes);
  CHECK((bytes_of(file) == bytes));
  os::write_whole(file, "");
  CHECK(bytes_of(file).empty());
  CHECK(!std::filesystem::exists(folder.path() / "plan.json.part"));
}

TEST_CASE("a file can be written whole beside the process, without a folder in its name") {
  const TemporaryFolder folder;
  const auto before = std::filesystem::current_path();
  std::filesystem::current_path(folder.path());
  os::write_whole("here.txt", "here");
  std::filesystem::current_path(before);
  CHECK(bytes_of(folder.path() / "here.txt") == "here");
}

TEST_CASE("publishing gives a finished part its name") {
  const TemporaryFolder folder;
  const auto part = folder.path() / "a.wav.part", file = folder.path() / "a.wav";
  write_bytes(part, "sound");
  os::publish(part, file);
  CHECK(bytes_of(file) == "sound");
  CHECK(!std::filesystem::exists(part));
  CHECK_THROWS_WITH_AS(os::publish(part, file), doctest::Contains("a.wav.part"), InputError);
  CHECK(bytes_of(file) == "sound");
}

TEST_CASE("lines are appended") {
  const TemporaryFolder folder;
  const auto file = folder.path() / "journal.jsonl";
  os::append_line(file, "one");
  os::append_line(file, "two");
  CHECK(bytes_of(file) == "one\ntwo\n");
}

TEST_CASE("what cannot be written is told with the file and the system's reason") {
  const TemporaryFolder folder;
  const auto nowhere = folder.path() / "missing" / "a.txt";
  CHECK_THROWS_WITH_AS(os::write_whole(nowhere, "x"),
                       doctest::Contains("No such file or directory"), InputError);
  CHECK_THROWS_WITH_AS(os::append_line(nowhere, "x"), doctest::Contains(nowhere.string().c_str()),
                       InputError);
  // A folder stands where the file should go: the part cannot be named, and the folder stays.
  std::filesystem::create_directories(folder.path() / "taken" / "inner");
  CHECK_THROWS_WITH_AS(os::write_whole(folder.path() / "taken", "x"),
                       doctest::Contains("cannot be named"), InputError);
  CHECK(std::filesystem::exists(folder.path() / "taken" / "inner"));
}

TEST_CASE("stderr is silent while asked for, and speaks again afterwards") {
  const TemporaryFolder folder;
  const auto file = folder.path() / "stderr.txt";
  // The process's stderr goes to a file for the test; a second guard restores it at the end.
  os::QuietStderr restore_at_the_end;
  REQUIRE(std::freopen(file.string().c_str(), "w", stderr) != nullptr);
  std::fputs("before ", stderr);
  {
    os::QuietStderr quiet;
    std::fputs("chatter ", stderr);
  }
  std::fputs("after", stderr);
  std::fflush(stderr);
  CHECK(bytes_of(file) == "before after");
}

TEST_CASE("interrupts and terminations set a flag and end nothing") {
  os::catch_interrupts();
  CHECK(!os::interrupted());
  std::raise(SIGTERM);
  CHECK(os::interrupted());
  std::raise(SIGINT);
  CHECK(os::interrupted());
  std::signal(SIGINT, SIG_DFL);
  std::signal(SIGTERM, SIG_DFL);
}

TEST_CASE("the time is ISO 8601 in UTC, in order") {
  const std::string now = os::utc_now();
  CHECK(std::regex_match(now, std::regex(R"(20\d\d-[01]\d-[0-3]\dT[0-2]\d:[0-5]\d:[0-6]\dZ)")));
  CHECK(now <= os::utc_now());
}

}  // namespace kneeprint
