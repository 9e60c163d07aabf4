// SPDX-License-Identifier: GPL-3.0-or-later
#include "print/journal.h"

#include <doctest/doctest.h>

#include <limits>

#include "print/checksum.h"
#include "quantity/failure.h"
#include "temporary_folder.h"

namespace kneeprint {
namespace {

const JournalBegin kBegin{"Valve box \"A\", серия 2", 18446744073709551615ULL,
                          "2024-05-01T10:00:00Z", "kneeprint 0.1.0"};

JournalTake take(int number) {
  JournalTake t;
  t.number = number;
  t.file = "takes/003-steady-997Hz-r4.wav";
  t.crc32 = "0badcafe";
  t.method = "steady";
  t.frequency_hz = 997.0;
  t.rung = 4;
  t.send_dbfs = -59.300000000000004;
  t.hold_s = 2.0;
  t.delay_samples = 1.0 / 3.0;
  t.attempts = 2;
  t.started = "2024-05-01T10:00:01Z";
  t.ended = "2024-05-01T10:00:04Z";
  t.guard = "ceiling";
  return t;
}

const JournalStop kStop{"thd", "THD reached 30 %.", "2024-05-01T10:01:00Z"};

std::string whole() {
  return journal_line(kBegin) + "\n" + journal_line(take(0)) + "\n" + journal_line(take(1)) + "\n" +
         journal_line(kStop) + "\n";
}

/// A journal file that can be written over and over.
class JournalFile {
 public:
  Journal read(const std::string& bytes, bool repair = false) const {
    testing::write_bytes(path(), bytes);
    return read_journal(path(), repair);
  }
  std::string refusal(const std::string& bytes) const {
    try {
      read(bytes);
    } catch (const InputError& e) {
      const std::string text = e.what();
      REQUIRE(text.starts_with(path().string() + ": "));
      return text.substr(path().string().size() + 2);
    }
    return "(accepted)";
  }
  std::filesystem::path path() const { return folder_.path() / "journal.jsonl"; }

 private:
  testing::TemporaryFolder folder_;
};

std::string resealed(std::string object) {
  const std::string crc = crc32_hex(object);
  object.pop_back();
  return object + ",\"line_crc32\":\"" + crc + "\"}\n";
}

}  // namespace

TEST_CASE("every field of every event comes back exactly") {
  const Journal journal = JournalFile().read(whole());
  CHECK(journal.begin.unit == kBegin.unit);
  CHECK(journal.begin.seed == kBegin.seed);
  CHECK(journal.begin.started == kBegin.started);
  CHECK(journal.begin.program == kBegin.program);
  REQUIRE(journal.takes.size() == 2);
  const JournalTake expected = take(1), &found = journal.takes[1];
  CHECK(found.number == expected.number);
  CHECK(found.file == expected.file);
  CHECK(found.crc32 == expected.crc32);
  CHECK(found.method == expected.method);
  CHECK(found.frequency_hz == expected.frequency_hz);
  CHECK(found.rung == expected.rung);
  CHECK(found.send_dbfs == expected.send_dbfs);
  CHECK(found.hold_s == expected.hold_s);
  CHECK(found.delay_samples == expected.delay_samples);
  CHECK(found.attempts == expected.attempts);
  CHECK(found.started == expected.started);
  CHECK(found.ended == expected.ended);
  CHECK(found.guard == expected.guard);
  REQUIRE(journal.stops.size() == 1);
  CHECK(journal.stops[0].reason == kStop.reason);
  CHECK(journal.stops[0].sentence == kStop.sentence);
  CHECK(journal.stops[0].at == kStop.at);
}

TEST_CASE("an event is one line, whatever the user typed") {
  JournalBegin begin = kBegin;
  begin.unit = "two\nlines \xff and a byte that is not UTF-8";
  const std::string line = journal_line(begin);
  CHECK(line.find('\n') == std::string::npos);
  CHECK(JournalFile().read(line + "\n").begin.unit ==
        "two\nlines \xef\xbf\xbd and a byte that is not UTF-8");  // U+FFFD
}

TEST_CASE("a figure that is not finite is never written") {
  JournalTake bad = take(1);
  bad.delay_samples = std::numeric_limits<double>::quiet_NaN();
  CHECK_THROWS_AS(journal_line(bad), std::invalid_argument);
}

TEST_CASE("every flipped bit in every byte of a line is found, and the line named") {
  const JournalFile file;
  const std::string lines[] = {journal_line(kBegin) + "\n", journal_line(take(1)) + "\n",
                               journal_line(kStop) + "\n"};
  std::size_t start = 0;
  for (int number = 1; number <= 3; ++number) {
    const std::size_t length = lines[number - 1].size();
    int missed = 0, misplaced = 0;
    for (std::size_t byte = start; byte < start + length; ++byte) {
      for (int bit = 0; bit < 8; ++bit) {
        std::string bytes = lines[0] + lines[1] + lines[2] + journal_line(take(2)) + "\n";
        bytes[byte] = static_cast<char>(bytes[byte] ^ (1 << bit));
        const std::string text = file.refusal(bytes);
        missed += text == "(accepted)";
        misplaced += !text.starts_with("line " + std::to_string(number) + ": ");
      }
    }
    CAPTURE(number);
    CHECK(missed == 0);
    CHECK(misplaced == 0);
    start += length;
  }
}

TEST_CASE("a last line torn at any byte is dropped, and cut off by a repair") {
  const JournalFile file;
  const std::string kept = journal_line(kBegin) + "\n" + journal_line(take(0)) + "\n";
  const std::string last = journal_line(take(1));
  int wrong_takes = 0, touched = 0, not_cut = 0, not_continued = 0;
  for (std::size_t length = 0; length <= last.size(); ++length) {
    const std::string torn = kept + last.substr(0, length);
    wrong_takes += file.read(torn, false).takes.size() != 1;
    touched += testing::bytes_of(file.path()) != torn;
    wrong_takes += file.read(torn, true).takes.size() != 1;
    not_cut += testing::bytes_of(file.path()) != kept;
    not_continued += file.read(testing::bytes_of(file.path()) + last + "\n").takes.size() != 2;
  }
  CHECK(wrong_takes == 0);
  CHECK(touched == 0);
  CHECK(not_cut == 0);
  CHECK(not_continued == 0);
}

TEST_CASE("takes stand by number, and a later line of the same number replaces the earlier") {
  JournalTake again = take(2);
  again.attempts = 3;
  const Journal journal = JournalFile().read(
      journal_line(kBegin) + "\n" + journal_line(take(2)) + "\n" + journal_line(take(0)) + "\n" +
      journal_line(take(1)) + "\n" + journal_line(again) + "\n");
  REQUIRE(journal.takes.size() == 3);
  for (int number = 0; number < 3; ++number) {
    CHECK(journal.takes[static_cast<std::size_t>(number)].number == number);
  }
  CHECK(journal.takes[2].attempts == 3);
}

TEST_CASE("a newer format is refused politely, whatever else it holds") {
  CHECK(JournalFile().refusal(resealed(
            R"({"event":"begin","format":"kneeprint-journal","version":2,"whatever":[]})")) ==
        "line 1: written by a newer Kneeprint (format 2, this one reads up to 1)");
}

TEST_CASE("a journal without its beginning, or with foreign events or fields, is refused") {
  const JournalFile file;
  const std::string begin = journal_line(kBegin) + "\n";
  CHECK(file.refusal("") == "line 1: no finished line; expected the event \"begin\"");
  CHECK(file.refusal(journal_line(kBegin)) ==
        "line 1: no finished line; expected the event \"begin\"");
  CHECK(file.refusal(journal_line(take(0)) + "\n") ==
        "line 1: field \"event\": unknown event \"take\"; expected one of: begin");
  CHECK(file.refusal(begin + begin) ==
        "line 2: field \"event\": unknown event \"begin\"; expected one of: take, stop");
  CHECK(file.refusal(begin + resealed(R"({"event":"stop","reason":"top"})")) ==
        "line 2: field \"sentence\": missing; expected text in quotes");
  CHECK(file.refusal(begin + resealed(R"({"event":"stop","because":"top"})")) ==
        "line 2: field \"because\": unknown field; expected one of: event, reason, sentence, at");
  CHECK(file.refusal(begin + "\n").starts_with("line 2: the line does not match its checksum"));
  CHECK(file.refusal(begin + resealed("{nonsense}")).starts_with("line 2: not JSON: "));
  CHECK_THROWS_AS(read_journal(file.path().parent_path() / "absent", false), InputError);
}

}  // namespace kneeprint
