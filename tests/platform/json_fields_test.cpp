// SPDX-License-Identifier: GPL-3.0-or-later
#include "platform/json_fields.h"

#include <doctest/doctest.h>

#include "quantity/failure.h"

namespace kneeprint {
namespace {

template <class Act>
std::string refusal(Act act) {
  try {
    act();
  } catch (const InputError& e) {
    CHECK(e.code() == ExitCode::bad_input);
    return e.what();
  }
  return "(accepted)";
}

}  // namespace

TEST_CASE("what is not JSON is refused with its line and column") {
  const std::string text = refusal([] { parse_json("{\n  \"a\": 1,\n  b\n}", "f.json"); });
  CHECK(text.starts_with("f.json: not JSON: line 3, column 3: "));
  CHECK(
      refusal([] { parse_json("", "f.json"); }).starts_with("f.json: not JSON: line 1, column 1"));
  CHECK(refusal([] { parse_json("[1e999]", "f.json"); }).starts_with("f.json: not JSON: "));
  CHECK(refusal([] { parse_json("[NaN]", "f.json"); }).starts_with("f.json: not JSON: line 1"));
  CHECK(refusal([] { parse_json("\"\xff\"", "f.json"); }).starts_with("f.json: not JSON: line 1"));
}

TEST_CASE(
    "a field given twice is refused, also in an inner object; the same name elsewhere is not") {
  CHECK(refusal([] { parse_json(R"({"a":1,"b":2,"a":3})", "f"); }) ==
        "f: field \"a\" is given twice");
  CHECK(refusal([] { parse_json(R"({"a":{"c":1,"c":1}})", "f"); }) ==
        "f: field \"c\" is given twice");
  CHECK(parse_json(R"({"a":{"a":1},"b":[{"a":1},{"a":2}]})", "f").size() == 2);
}

TEST_CASE("every kind of field names file, field, what was found and what was expected") {
  const auto json = parse_json(R"({"n":-3,"half":2.5,"t":"x","list":[1,"two"],)"
                               R"("o":{"inner":{"deep":true}},"os":[{"k":1},7]})",
                               "f");
  const JsonFields fields(json, "f");
  CHECK(refusal([&] {
          fields.number("n", {0.0, 5.0});
        }) == "f: field \"n\": found -3; expected a number from 0 to 5");
  CHECK(refusal([&] {
          fields.number("n", {-3.0, 5.0, true});
        }) == "f: field \"n\": found -3; expected a number above -3 and at most 5");
  CHECK(fields.number("n", {-3.0, 5.0}) == -3.0);
  CHECK(refusal([&] { fields.number("t"); }) == "f: field \"t\": found \"x\"; expected a number");
  CHECK(refusal([&] { fields.integer("half", 0, 9); }) ==
        "f: field \"half\": found 2.5; expected a whole number from 0 to 9");
  CHECK(refusal([&] { fields.integer("t", 0, 9); }) ==
        "f: field \"t\": found \"x\"; expected a whole number from 0 to 9");
  CHECK(refusal([&] { fields.unsigned_integer("n"); }) ==
        "f: field \"n\": found -3; expected a whole number of at least 0");
  CHECK(refusal([&] { fields.text("n"); }) == "f: field \"n\": found -3; expected text in quotes");
  CHECK(refusal([&] { fields.text("absent"); }) ==
        "f: field \"absent\": missing; expected text in quotes");
  CHECK(refusal([&] {
          fields.choice("t", "letter", {"a", "b"});
        }) == "f: field \"t\": unknown letter \"x\"; expected one of: a, b");
  CHECK(refusal([&] {
          fields.numbers("list", {0.0, 5.0});
        }) == "f: field \"list[1]\": found \"two\"; expected a number from 0 to 5");
  CHECK(refusal([&] {
          fields.numbers("t", {0.0, 5.0});
        }) == "f: field \"t\": found \"x\"; expected a list of numbers from 0 to 5");
  CHECK(refusal([&] { fields.object("o").object("inner").object("deep"); }) ==
        "f: field \"o.inner.deep\": found true; expected an object");
  CHECK(refusal([&] { fields.objects("os"); }) ==
        "f: field \"os[1]\": found 7; expected an object");
  CHECK(refusal([&] { fields.object("o").allow_only({"outer"}); }) ==
        "f: field \"o.inner\": unknown field; expected one of: outer");
  CHECK(refusal([] { JsonFields(nlohmann::json(7), "f"); }) == "f: found 7; expected an object");
}

TEST_CASE("a long value is cut short in a message") {
  const nlohmann::json json{{"t", std::string(5000, 'x')}};
  CHECK(refusal([&] { JsonFields(json, "f").number("t"); }).size() < 150);
}

TEST_CASE("another format and a newer version are refused") {
  const auto check = [](const char* text) {
    const auto json = parse_json(text, "f");
    JsonFields(json, "f").check_format("kneeprint-x", 1);
  };
  check(R"({"format":"kneeprint-x","version":1})");
  CHECK(refusal([&] { check(R"({"format":"kneeprint-y","version":1})"); }) ==
        "f: field \"format\": found \"kneeprint-y\"; expected \"kneeprint-x\"");
  CHECK(refusal([&] { check(R"({"format":"kneeprint-x","version":2})"); }) ==
        "f: written by a newer Kneeprint (format 2, this one reads up to 1)");
  CHECK(refusal([&] {
          check(R"({"format":"kneeprint-x"})");
        }).starts_with("f: field \"version\": missing"));
  CHECK(refusal([&] {
          check(R"({"format":"kneeprint-x","version":0})");
        }).starts_with("f: field \"version\": found 0"));
}

}  // namespace kneeprint
