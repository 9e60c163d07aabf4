// SPDX-License-Identifier: GPL-3.0-or-later
// Strict reading of a JSON object that a person may have written: every refusal is an InputError
// that names the file, the field, what was found and what was expected.
#pragma once

#include <cstdint>
#include <nlohmann/json.hpp>
#include <string>
#include <string_view>
#include <vector>

namespace kneeprint {

/// The text as JSON. `origin` names the file in messages. Throws InputError with line and column
/// when it is not JSON, and for a field given twice.
nlohmann::json parse_json(const std::string& text, const std::string& origin);

/// Interval of numbers that a field may hold, for the check and for its message.
struct Bounds {
  double least;
  double most;
  bool above_least = false;  ///< `least` itself is excluded
};

/// One object. The JSON value must outlive it.
class JsonFields {
 public:
  /// `path` is the object's own name within the file: "" at the top, else "steps[1]".
  JsonFields(const nlohmann::json& value, std::string origin, std::string path = "");

  /// Refuses fields of any other name.
  void allow_only(const std::vector<std::string>& names) const;
  bool has(const std::string& name) const { return value_.contains(name); }
  bool is_null(const std::string& name) const;  ///< there, and null

  double number(const std::string& name, Bounds bounds) const;
  double number(const std::string& name) const;  ///< any finite one
  int integer(const std::string& name, int least, int most) const;
  std::uint64_t unsigned_integer(const std::string& name) const;
  bool boolean(const std::string& name) const;
  std::string text(const std::string& name) const;
  /// One of `choices`; `noun` says what they are: 'unknown method "foo"; expected one of: ...'.
  std::string choice(const std::string& name, std::string_view noun,
                     const std::vector<std::string>& choices) const;
  std::vector<double> numbers(const std::string& name, Bounds each) const;
  std::vector<std::string> texts(const std::string& name) const;
  JsonFields object(const std::string& name) const;
  std::vector<JsonFields> objects(const std::string& name) const;

  /// Refuses a file of another `format`, or of a version above `newest`, once both fields are
  /// there.
  void check_format(const std::string& format, int newest) const;

  [[noreturn]] void refuse(const std::string& name, const std::string& problem) const;

 private:
  const nlohmann::json& at(const std::string& name, const std::string& expected) const;
  std::string path_of(const std::string& name) const;

  const nlohmann::json& value_;
  std::string origin_, path_;
};

/// "a, b, c".
std::string listed(const std::vector<std::string>& words);

}  // namespace kneeprint
