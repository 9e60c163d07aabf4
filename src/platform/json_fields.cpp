// SPDX-License-Identifier: GPL-3.0-or-later
#include "platform/json_fields.h"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>
#include <set>

#include "quantity/failure.h"

namespace kneeprint {
namespace {

using nlohmann::json;

/// A value as a message quotes it: on one line, and not longer than a reader cares for.
std::string quoted(const json& value) {
  constexpr std::size_t kLongest = 60;
  std::string text = value.dump(-1, ' ', true, json::error_handler_t::replace);
  if (text.size() > kLongest) text = text.substr(0, kLongest) + "...";
  return text;
}

std::string described(Bounds b) {
  return b.above_least ? fmt::format("above {} and at most {}", b.least, b.most)
                       : fmt::format("from {} to {}", b.least, b.most);
}

bool within(double x, Bounds b) {
  return (b.above_least ? x > b.least : x >= b.least) && x <= b.most;
}

}  // namespace

std::string listed(const std::vector<std::string>& words) {
  return fmt::format("{}", fmt::join(words, ", "));
}

json parse_json(const std::string& text, const std::string& origin) {
  // The library would keep the last of two fields of one name and say nothing.
  std::vector<std::set<std::string>> open_objects;
  const auto refuse_doubles = [&](int, json::parse_event_t event, json& value) {
    if (event == json::parse_event_t::object_start) open_objects.emplace_back();
    if (event == json::parse_event_t::object_end) open_objects.pop_back();
    if (event == json::parse_event_t::key &&
        !open_objects.back().insert(value.get<std::string>()).second) {
      throw InputError(fmt::format("{}: field {} is given twice", origin, quoted(value)));
    }
    return true;
  };
  try {
    return json::parse(text, refuse_doubles);
  } catch (const json::exception& e) {
    // "[json.exception.parse_error.101] parse error at line 1, column 2: ..." from its position on.
    const std::string_view what = e.what();
    const std::size_t position = what.find("line ");
    const std::size_t reason = position != what.npos ? position : what.find("] ") + 2;
    throw InputError(fmt::format("{}: not JSON: {}", origin, what.substr(reason)));
  }
}

JsonFields::JsonFields(const json& value, std::string origin, std::string path)
    : value_(value), origin_(std::move(origin)), path_(std::move(path)) {
  if (value_.is_object()) return;
  const std::string where = path_.empty() ? "" : fmt::format(" field \"{}\":", path_);
  throw InputError(
      fmt::format("{}:{} found {}; expected an object", origin_, where, quoted(value_)));
}

void JsonFields::allow_only(const std::vector<std::string>& names) const {
  for (const auto& [name, ignored] : value_.items()) {
    if (std::find(names.begin(), names.end(), name) == names.end()) {
      refuse(name, "unknown field; expected one of: " + listed(names));
    }
  }
}

double JsonFields::number(const std::string& name, Bounds bounds) const {
  const std::string expected = "a number " + described(bounds);
  const json& value = at(name, expected);
  if (!value.is_number() || !within(value.get<double>(), bounds)) {
    refuse(name, fmt::format("found {}; expected {}", quoted(value), expected));
  }
  return value.get<double>();
}

double JsonFields::number(const std::string& name) const {
  const json& value = at(name, "a number");
  if (!value.is_number()) refuse(name, fmt::format("found {}; expected a number", quoted(value)));
  return value.get<double>();
}

int JsonFields::integer(const std::string& name, int least, int most) const {
  const Bounds bounds{static_cast<double>(least), static_cast<double>(most)};
  const std::string expected = "a whole number " + described(bounds);
  const json& value = at(name, expected);
  const double x = value.is_number() ? value.get<double>() : 0.5;
  if (x != std::floor(x) || !within(x, bounds)) {
    refuse(name, fmt::format("found {}; expected {}", quoted(value), expected));
  }
  return static_cast<int>(x);
}

std::uint64_t JsonFields::unsigned_integer(const std::string& name) const {
  const std::string expected = "a whole number of at least 0";
  const json& value = at(name, expected);
  if (!value.is_number_unsigned()) {
    refuse(name, fmt::format("found {}; expected {}", quoted(value), expected));
  }
  return value.get<std::uint64_t>();
}

bool JsonFields::boolean(const std::string& name) const {
  const json& value = at(name, "true or false");
  if (!value.is_boolean()) {
    refuse(name, fmt::format("found {}; expected true or false", quoted(value)));
  }
  return value.get<bool>();
}

std::string JsonFields::text(const std::string& name) const {
  const json& value = at(name, "text in quotes");
  if (!value.is_string()) {
    refuse(name, fmt::format("found {}; expected text in quotes", quoted(value)));
  }
  return value.get<std::string>();
}

std::string JsonFields::choice(const std::string& name, std::string_view noun,
                               const std::vector<std::string>& choices) const {
  const json& value = at(name, "one of: " + listed(choices));
  if (!value.is_string() ||
      std::find(choices.begin(), choices.end(), value.get<std::string>()) == choices.end()) {
    refuse(name,
           fmt::format("unknown {} {}; expected one of: {}", noun, quoted(value), listed(choices)));
  }
  return value.get<std::string>();
}

std::vector<double> JsonFields::numbers(const std::string& name, Bounds each) const {
  const std::string expected = fmt::format("a list of numbers {}", described(each));
  const json& list = at(name, expected);
  if (!list.is_array()) {
    refuse(name, fmt::format("found {}; expected {}", quoted(list), expected));
  }
  std::vector<double> values;
  for (const json& value : list) {
    if (!value.is_number() || !within(value.get<double>(), each)) {
      refuse(fmt::format("{}[{}]", name, values.size()),
             fmt::format("found {}; expected a number {}", quoted(value), described(each)));
    }
    values.push_back(value.get<double>());
  }
  return values;
}

std::vector<std::string> JsonFields::texts(const std::string& name) const {
  const json& list = at(name, "a list of texts");
  if (!list.is_array()) {
    refuse(name, fmt::format("found {}; expected a list of texts", quoted(list)));
  }
  std::vector<std::string> values;
  for (const json& value : list) {
    if (!value.is_string()) {
      refuse(fmt::format("{}[{}]", name, values.size()),
             fmt::format("found {}; expected text in quotes", quoted(value)));
    }
    values.push_back(value.get<std::string>());
  }
  return values;
}

bool JsonFields::is_null(const std::string& name) const {
  return at(name, "a value, or null").is_null();
}

JsonFields JsonFields::object(const std::string& name) const {
  return {at(name, "an object"), origin_, path_of(name)};
}

std::vector<JsonFields> JsonFields::objects(const std::string& name) const {
  const json& list = at(name, "a list of objects");
  if (!list.is_array()) {
    refuse(name, fmt::format("found {}; expected a list of objects", quoted(list)));
  }
  std::vector<JsonFields> result;
  for (const json& value : list) {
    result.emplace_back(value, origin_, fmt::format("{}[{}]", path_of(name), result.size()));
  }
  return result;
}

void JsonFields::check_format(const std::string& format, int newest) const {
  if (const std::string found = text("format"); found != format) {
    refuse("format", fmt::format("found \"{}\"; expected \"{}\"", found, format));
  }
  constexpr int kAnyVersion = 1000000;
  if (const int found = integer("version", 1, kAnyVersion); found > newest) {
    throw InputError(
        fmt::format("{}: written by a newer Kneeprint (format {}, this one reads up to {})",
                    origin_, found, newest));
  }
}

void JsonFields::refuse(const std::string& name, const std::string& problem) const {
  throw InputError(fmt::format("{}: field \"{}\": {}", origin_, path_of(name), problem));
}

const json& JsonFields::at(const std::string& name, const std::string& expected) const {
  const auto found = value_.find(name);
  if (found == value_.end()) refuse(name, "missing; expected " + expected);
  return *found;
}

std::string JsonFields::path_of(const std::string& name) const {
  return path_.empty() ? name : path_ + "." + name;
}

}  // namespace kneeprint
