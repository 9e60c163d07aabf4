// SPDX-License-Identifier: GPL-3.0-or-later
// A line is one JSON object whose last field, "line_crc32", is the checksum of the object without
// it. That holds for every version of the format, so that a damaged line is never taken for a newer
// one.
#include "print/journal.h"

#include <fmt/format.h>

#include <cmath>
#include <map>
#include <nlohmann/json.hpp>
#include <stdexcept>
#include <string_view>
#include <system_error>

#include "platform/json_fields.h"
#include "platform/read_text.h"
#include "print/checksum.h"
#include "quantity/failure.h"

namespace kneeprint {
namespace {

using nlohmann::ordered_json;

constexpr int kNewestVersion = 1;
const std::string kFormat = "kneeprint-journal";

/// What closes a line in place of the object's own brace.
std::string seal(std::string_view object) {
  return fmt::format(",\"line_crc32\":\"{}\"}}", crc32_hex(object));
}

std::string sealed(const ordered_json& event) {
  // The unit's name is free text from a command line: what is not UTF-8 becomes U+FFFD.
  const std::string object = event.dump(-1, ' ', false, ordered_json::error_handler_t::replace);
  return object.substr(0, object.size() - 1) + seal(object);
}

/// The object of a line. Throws InputError when the line is not as it was written.
nlohmann::json unsealed(std::string_view line, const std::string& origin) {
  static const std::size_t seal_length = seal("").size();
  if (line.size() >= seal_length) {
    const std::size_t end = line.size() - seal_length;
    const std::string object = std::string(line.substr(0, end)) + "}";
    if (line.substr(end) == seal(object)) return parse_json(object, origin);
  }
  throw InputError(origin +
                   ": the line does not match its checksum (the file was changed or damaged); "
                   "expected an unchanged line that ends in \"line_crc32\"");
}

double finite(double x) {
  if (!std::isfinite(x)) throw std::invalid_argument("journal_line: a figure is not finite");
  return x;
}

JournalBegin read_begin(const JsonFields& fields) {
  fields.check_format(kFormat, kNewestVersion);
  fields.allow_only({"event", "format", "version", "unit", "seed", "started", "program"});
  return {fields.text("unit"), fields.unsigned_integer("seed"), fields.text("started"),
          fields.text("program")};
}

JournalTake read_take(const JsonFields& fields) {
  fields.allow_only({"event", "number", "file", "crc32", "method", "frequency_hz", "rung",
                     "send_dbfs", "hold_s", "delay_samples", "attempts", "sound_s", "read_s",
                     "settling_s", "tail_s", "discarded_s", "started", "ended", "guard"});
  constexpr int kMany = 1000000;
  JournalTake take;
  take.number = fields.integer("number", 0, kMany);
  take.file = fields.text("file");
  take.crc32 = fields.text("crc32");
  take.method = fields.text("method");
  take.frequency_hz = fields.number("frequency_hz");
  take.rung = fields.integer("rung", -1, kMany);
  take.send_dbfs = fields.number("send_dbfs");
  take.hold_s = fields.number("hold_s");
  take.delay_samples = fields.number("delay_samples");
  take.attempts = fields.integer("attempts", 1, kMany);
  const auto seconds = [&](const char* name) {
    return fields.has(name) ? fields.number(name) : 0.0;  // journals of before do not say
  };
  take.sound_s = seconds("sound_s");
  take.read_s = seconds("read_s");
  take.settling_s = seconds("settling_s");
  take.tail_s = seconds("tail_s");
  take.discarded_s = seconds("discarded_s");
  take.started = fields.text("started");
  take.ended = fields.text("ended");
  take.guard = fields.text("guard");
  return take;
}

JournalStop read_stop(const JsonFields& fields) {
  fields.allow_only({"event", "reason", "sentence", "at"});
  return {fields.text("reason"), fields.text("sentence"), fields.text("at")};
}

}  // namespace

std::string journal_line(const JournalBegin& begin) {
  return sealed({{"event", "begin"},
                 {"format", kFormat},
                 {"version", kNewestVersion},
                 {"unit", begin.unit},
                 {"seed", begin.seed},
                 {"started", begin.started},
                 {"program", begin.program}});
}

std::string journal_line(const JournalTake& take) {
  return sealed({{"event", "take"},
                 {"number", take.number},
                 {"file", take.file},
                 {"crc32", take.crc32},
                 {"method", take.method},
                 {"frequency_hz", finite(take.frequency_hz)},
                 {"rung", take.rung},
                 {"send_dbfs", finite(take.send_dbfs)},
                 {"hold_s", finite(take.hold_s)},
                 {"delay_samples", finite(take.delay_samples)},
                 {"attempts", take.attempts},
                 {"sound_s", finite(take.sound_s)},
                 {"read_s", finite(take.read_s)},
                 {"settling_s", finite(take.settling_s)},
                 {"tail_s", finite(take.tail_s)},
                 {"discarded_s", finite(take.discarded_s)},
                 {"started", take.started},
                 {"ended", take.ended},
                 {"guard", take.guard}});
}

std::string journal_line(const JournalStop& stop) {
  return sealed(
      {{"event", "stop"}, {"reason", stop.reason}, {"sentence", stop.sentence}, {"at", stop.at}});
}

Journal read_journal(const std::filesystem::path& file, bool repair) {
  const std::string text = read_text(file);
  const std::size_t last_newline = text.rfind('\n');
  const std::size_t finished = last_newline == text.npos ? 0 : last_newline + 1;
  if (finished == 0) {
    throw InputError(
        fmt::format("{}: line 1: no finished line; expected the event \"begin\"", file.string()));
  }

  Journal journal;
  std::map<int, JournalTake> takes;
  std::string_view rest(text.data(), finished);
  for (int number = 1; !rest.empty(); ++number) {
    const std::size_t length = rest.find('\n');
    const std::string origin = fmt::format("{}: line {}", file.string(), number);
    const nlohmann::json object = unsealed(rest.substr(0, length), origin);
    const JsonFields fields(object, origin);
    if (number == 1) {
      fields.choice("event", "event", {"begin"});
      journal.begin = read_begin(fields);
    } else if (fields.choice("event", "event", {"take", "stop"}) == "take") {
      const JournalTake take = read_take(fields);
      takes[take.number] = take;
    } else {
      journal.stops.push_back(read_stop(fields));
    }
    rest.remove_prefix(length + 1);
  }
  for (auto& [ignored, take] : takes) journal.takes.push_back(std::move(take));

  if (repair && finished < text.size()) {
    std::error_code failed;
    std::filesystem::resize_file(file, finished, failed);
    if (failed) {
      throw InputError(fmt::format("{}: the unfinished last line cannot be cut off: {}",
                                   file.string(), failed.message()));
    }
  }
  return journal;
}

}  // namespace kneeprint
