// SPDX-License-Identifier: GPL-3.0-or-later
#include "print/folder.h"

#include <doctest/doctest.h>

#include <algorithm>

#include "platform/read_text.h"
#include "print/checksum.h"
#include "quantity/failure.h"
#include "temporary_folder.h"

namespace kneeprint {
namespace {

namespace fs = std::filesystem;

const JournalBegin kBegin{"box", 7, "2024-05-01T10:00:00Z", "kneeprint 0.1.0"};

/// Samples that are exact in float32, so that they come back as they were.
Waveform wave(double scale) {
  Waveform w{Hertz(48000.0), {}};
  for (int i = 0; i < 100; ++i) w.samples.push_back(scale * (i - 50) / 128.0);
  return w;
}

JournalTake steady(int number, int rung) {
  JournalTake take;
  take.number = number;
  take.method = "steady";
  take.frequency_hz = 997.0;
  take.rung = rung;
  return take;
}

template <class Act>
std::string refusal(Act act) {
  try {
    act();
  } catch (const InputError& e) {
    return e.what();
  }
  return "(accepted)";
}

std::vector<std::string> names_in(const fs::path& folder) {
  std::vector<std::string> names;
  for (const auto& entry : fs::directory_iterator(folder)) {
    names.push_back(entry.path().filename().string());
  }
  std::sort(names.begin(), names.end());
  return names;
}

}  // namespace

TEST_CASE("a folder begins with plan, rig and journal, once") {
  const testing::TemporaryFolder place;
  PrintFolder folder(place.path() / "deep" / "print");
  CHECK_FALSE(folder.exists());
  CHECK_FALSE(fs::exists(folder.path()));
  folder.begin("the plan\n", "the rig\n", kBegin);
  CHECK(folder.exists());
  CHECK(read_text(folder.plan_file()) == "the plan\n");
  CHECK(read_text(folder.rig_file()) == "the rig\n");
  CHECK(read_text(folder.journal_file()) == journal_line(kBegin) + "\n");
  CHECK(names_in(folder.path()) ==
        std::vector<std::string>{"curves", "journal.jsonl", "plan.json", "rig.json", "takes"});

  const std::string text = refusal([&] { folder.begin("other", "other", kBegin); });
  CHECK(text ==
        folder.path().string() +
            ": already holds a measurement (journal.jsonl); expected a new or empty folder");
  CHECK(read_text(folder.plan_file()) == "the plan\n");
}

TEST_CASE("a beginning that was killed before the journal may begin again") {
  const testing::TemporaryFolder place;
  PrintFolder folder(place.path());
  testing::write_bytes(folder.plan_file(), "half a pl");
  CHECK_FALSE(folder.exists());
  folder.begin("the plan", "the rig", kBegin);
  CHECK(read_text(folder.plan_file()) == "the plan");
}

TEST_CASE("a kept take is a whole file, named, checksummed and journalled") {
  const testing::TemporaryFolder place;
  PrintFolder folder(place.path());
  folder.begin("{}", "{}", kBegin);
  JournalTake check = steady(0, -1), first = steady(1, 0), second = steady(12, 20);
  check.method = "chain-check";
  second.method = "smpte";
  second.frequency_hz = 0.0;
  JournalTake third = steady(123, 3);
  third.frequency_hz = 31.5;
  folder.keep_take(check, {wave(0.25)});
  folder.keep_take(first, {wave(0.5), wave(1.0)});
  folder.keep_take(second, {wave(2.0)});
  folder.keep_take(third, {wave(1.0)});
  folder.keep_stop({"top", "The ladder ended at its top.", "2024-05-01T10:09:00Z"});

  CHECK(names_in(place.path() / "takes") ==
        std::vector<std::string>{"000-chain-check-997Hz.wav", "001-steady-997Hz-r0.wav",
                                 "012-smpte-r20.wav", "123-steady-31.5Hz-r3.wav"});
  const Journal journal = read_journal(folder.journal_file(), false);
  REQUIRE(journal.takes.size() == 4);
  CHECK(journal.takes[1].file == "takes/001-steady-997Hz-r0.wav");
  CHECK(journal.takes[1].file == first.file);
  CHECK(journal.takes[1].crc32 == first.crc32);
  CHECK(first.crc32 == crc32_hex(testing::bytes_of(place.path() / first.file)));
  REQUIRE(journal.stops.size() == 1);

  const std::vector<Waveform> channels = folder.load_take(journal.takes[1]);
  REQUIRE(channels.size() == 2);
  CHECK(channels[0].rate == Hertz(48000.0));
  CHECK(channels[0].samples == wave(0.5).samples);
  CHECK(channels[1].samples == wave(1.0).samples);
  CHECK(folder.load_take(journal.takes[2])[0].samples == wave(2.0).samples);  // above full scale
}

TEST_CASE("a take of the same number replaces the earlier one") {
  const testing::TemporaryFolder place;
  PrintFolder folder(place.path());
  folder.begin("{}", "{}", kBegin);
  JournalTake take = steady(1, 0);
  folder.keep_take(take, {wave(0.5)});
  const std::string before = take.crc32;
  folder.keep_take(take, {wave(0.25)});
  CHECK(take.crc32 != before);
  const Journal journal = read_journal(folder.journal_file(), false);
  REQUIRE(journal.takes.size() == 1);
  CHECK(folder.load_take(journal.takes[0])[0].samples == wave(0.25).samples);
}

TEST_CASE("a take that is missing, cut short or changed by one bit is refused with its name") {
  const testing::TemporaryFolder place;
  PrintFolder folder(place.path());
  folder.begin("{}", "{}", kBegin);
  JournalTake take = steady(1, 0);
  folder.keep_take(take, {wave(0.5)});
  const fs::path file = place.path() / take.file;
  const std::string good = testing::bytes_of(file);
  const std::string journalled =
      "; expected " + take.crc32 + ", which the journal states for take 1";

  int accepted = 0;
  for (std::size_t byte = 0; byte < good.size(); ++byte) {
    std::string bad = good;
    bad[byte] = static_cast<char>(bad[byte] ^ (1 << (byte % 8)));
    testing::write_bytes(file, bad);
    const std::string text = refusal([&] { folder.load_take(take); });
    accepted += !(text.starts_with(file.string() + ": found the checksum ") &&
                  text.find(journalled) != std::string::npos);
  }
  CHECK(accepted == 0);
  testing::write_bytes(file, good.substr(0, good.size() / 2));
  CHECK(refusal([&] { folder.load_take(take); }).find(journalled) != std::string::npos);
  testing::write_bytes(file, good);
  CHECK(folder.load_take(take).size() == 1);
  fs::remove(file);
  CHECK(refusal([&] { folder.load_take(take); }).starts_with(file.string() + ": cannot be read: "));
}

TEST_CASE("a folder that cannot be made is refused with its name and the reason") {
  const testing::TemporaryFolder place;
  const fs::path file = place.path() / "file";
  testing::write_bytes(file, "no folder");
  for (const fs::path& path : {file, file / "print"}) {
    PrintFolder folder(path);
    const std::string text = refusal([&] { folder.begin("{}", "{}", kBegin); });
    CAPTURE(text);
    CHECK(text.starts_with(path.string()));
    CHECK(text.find("the folder cannot be created: Not a directory") != std::string::npos);
  }
}

TEST_CASE("a take that cannot be written is refused, and the journal does not claim it") {
  const testing::TemporaryFolder place;
  PrintFolder folder(place.path());
  folder.begin("{}", "{}", kBegin);
  fs::remove(place.path() / "takes");
  JournalTake take = steady(1, 0);
  CHECK(refusal([&] {
          folder.keep_take(take, {wave(0.5)});
        }).starts_with((place.path() / "takes").string()));
  CHECK(read_journal(folder.journal_file(), false).takes.empty());
}

TEST_CASE("a result is written whole, over an earlier one, in a folder made for it") {
  const testing::TemporaryFolder place;
  const PrintFolder folder(place.path() / "print");
  const fs::path file = folder.curves() / "levels.csv";
  folder.write_result(file, "first, longer\n");
  folder.write_result(file, "second\n");
  CHECK(read_text(file) == "second\n");
  CHECK(names_in(folder.curves()) == std::vector<std::string>{"levels.csv"});
}

}  // namespace kneeprint
