// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/rig_file.h"

#include <doctest/doctest.h>

#include <cmath>
#include <nlohmann/json.hpp>
#include <random>
#include <string>
#include <vector>

#include "quantity/failure.h"
#include "temporary_folder.h"

using kneeprint::Decibels;
using kneeprint::FloorPoint;
using kneeprint::Hertz;
using kneeprint::InputError;
using kneeprint::LevelDbfs;
using kneeprint::LevelScale;
using kneeprint::Ohms;
using kneeprint::parse_rig;
using kneeprint::Rig;
using kneeprint::rig_json;
using kneeprint::RigKind;
using kneeprint::VoltsRms;
using nlohmann::json;

namespace {

// Twelve digits are written; the scale is then found again from them.
constexpr double kTwelveDigits = 1e-11;

Rig full_rig() {
  Rig rig;
  rig.name = "Bench \"A\", Übertrager";
  rig.kind = RigKind::live;
  rig.device = "Some Interface";
  rig.send_channel = 3;
  rig.return_channel = 4;
  rig.reference_channel = 2;
  rig.reference_tap = "terminals";
  rig.rate = Hertz(96000.0);
  rig.recorded_rate = Hertz(44100.0);
  rig.marker_polarity = -1;
  rig.send_scale = LevelScale::calibrated(VoltsRms(8.69), Decibels(0.05));
  rig.return_scale = LevelScale::calibrated(VoltsRms(1.23), Decibels(0.07));
  rig.dc_coupled_send = true;
  rig.wiring = "pin 3 open";
  rig.source_impedance = Ohms(47.5);
  rig.load_impedance = Ohms(10000.0);
  rig.ceiling_dbfs = -6.5;
  rig.floor = kneeprint::RigFloor({{LevelDbfs(-20.0), 2, Decibels(-121.3)},
                                   {LevelDbfs(-60.0), 2, Decibels(-110.0)},
                                   {LevelDbfs(-20.0), 3, Decibels(-125.25)}});
  rig.calibrated_on = "2026-05-01";
  rig.invented = true;
  return rig;
}

json example() { return json::parse(rig_json(full_rig())); }

void check_same(const LevelScale& a, const LevelScale& b) {
  CHECK(a.unit == b.unit);
  CHECK(a.offset_db == doctest::Approx(b.offset_db).epsilon(kTwelveDigits));
  CHECK(a.peak_per_full_scale == doctest::Approx(b.peak_per_full_scale).epsilon(kTwelveDigits));
  CHECK(a.standard_uncertainty == b.standard_uncertainty);
}

std::string refusal(const std::string& text) {
  try {
    parse_rig(text, "bench.json");
  } catch (const InputError& e) {
    CHECK(e.code() == kneeprint::ExitCode::bad_input);
    return e.what();
  }
  return "(accepted)";
}

// The example with one field set, or taken away when `value` is "discarded".
std::string refusal_with(const char* pointer, const json& value) {
  json j = example();
  const json::json_pointer at(pointer);
  if (value.is_discarded()) {
    j.at(at.parent_pointer()).erase(at.back());
  } else {
    j[at] = value;
  }
  return refusal(j.dump());
}

const json kGone(json::value_t::discarded);

}  // namespace

TEST_CASE("every field comes back") {
  const Rig a = full_rig();
  const Rig b = parse_rig(rig_json(a), "bench.json");
  CHECK(b.name == a.name);
  CHECK(b.kind == a.kind);
  CHECK(b.device == a.device);
  CHECK(b.send_channel == 3);
  CHECK(b.return_channel == 4);
  CHECK(b.reference_channel == 2);
  CHECK(b.reference_tap == "terminals");
  CHECK(b.rate == a.rate);
  CHECK(b.recorded_rate == a.recorded_rate);
  CHECK(b.marker_polarity == -1);
  check_same(b.send_scale, a.send_scale);
  check_same(b.return_scale, a.return_scale);
  CHECK(b.dc_coupled_send);
  CHECK_FALSE(b.dc_coupled_return);
  CHECK(b.wiring == a.wiring);
  CHECK(b.source_impedance == a.source_impedance);
  CHECK(b.load_impedance == a.load_impedance);
  CHECK(b.ceiling_dbfs == a.ceiling_dbfs);
  CHECK(b.calibrated_on == a.calibrated_on);
  CHECK(b.invented);
  REQUIRE(b.floor.points().size() == 3);
  for (std::size_t i = 0; i < 3; ++i) {
    const FloorPoint &p = a.floor.points()[i], &q = b.floor.points()[i];
    CHECK(p.level == q.level);
    CHECK(p.order == q.order);
    CHECK(p.relative == q.relative);
  }
}

TEST_CASE("the text is stable: read and written again it is the same, digit for digit") {
  std::mt19937_64 random(20260501);
  std::uniform_real_distribution<double> decades(-3.9, 3.9);
  for (int i = 0; i < 2000; ++i) {
    Rig rig = full_rig();
    const VoltsRms send(std::pow(10.0, decades(random))), ret(std::pow(10.0, decades(random)));
    rig.send_scale = LevelScale::calibrated(send, Decibels(0.01 * i));
    rig.return_scale = LevelScale::calibrated(ret, Decibels(0.0));
    // No uncertainty above 10 dB is taken.
    if (i > 1000) rig.send_scale.standard_uncertainty = Decibels(10.0);
    const std::string text = rig_json(rig);
    REQUIRE(rig_json(parse_rig(text, "bench.json")) == text);
  }
  // What a person wrote is not decorated.
  CHECK(rig_json(full_rig()).find("\"full_scale_v_rms\": 1.23,") != std::string::npos);
  CHECK(rig_json(full_rig()).find("\"full_scale_v_rms\": 8.69,") != std::string::npos);
}

TEST_CASE("the least that a rig file needs leaves the rig uncalibrated") {
  const Rig rig = parse_rig(R"({"format":"kneeprint-rig","version":1,"name":"x","kind":"live",
      "device":"2","rate_hz":48000,"send":{},"return":{}})",
                            "bench.json");
  CHECK(rig.device == "2");
  CHECK(rig.send_channel == 1);
  CHECK(rig.return_channel == 1);
  CHECK_FALSE(rig.send_scale.is_calibrated());
  CHECK_FALSE(rig.return_scale.is_calibrated());
  CHECK_FALSE(rig.reference_channel.has_value());
  CHECK_FALSE(rig.dc_coupled_return);
  CHECK_FALSE(rig.ceiling_dbfs.has_value());
  CHECK_FALSE(rig.floor.known());
  CHECK_FALSE(rig.invented);
  CHECK(rig_json(parse_rig(rig_json(rig), "bench.json")) == rig_json(rig));
}

TEST_CASE("full scales become levels") {
  json j = example();
  // 0 dBu is the voltage of 1 mW in 600 ohm, sqrt(0.6) V (common practice): ten times that is +20.
  j["send"]["full_scale_v_rms"] = 10.0 * std::sqrt(0.001 * 600.0);
  const Rig rig = parse_rig(j.dump(), "bench.json");
  CHECK(rig.send_scale.level_of(LevelDbfs(0.0)) == doctest::Approx(20.0).epsilon(1e-14));
  CHECK(rig.send_scale.level_of(LevelDbfs(-16.0)) == doctest::Approx(4.0).epsilon(1e-14));
}

TEST_CASE("every wrong field is refused by file, field, expected and found") {
  struct Case {
    const char* pointer;
    json value;
    const char* field;
    const char* found;
    const char* expected;
  };
  const std::vector<Case> cases{
      {"/name", 7, "name", "found 7", "expected text"},
      {"/name", kGone, "name", "missing", "expected text"},
      {"/kind", "tape", "kind", "\"tape\"", "one of: virtual, live, reel"},
      {"/kind", kGone, "kind", "missing", "virtual"},
      {"/device", kGone, "device", "missing", "expected text"},
      {"/device", "", "device", "found \"\"", "index"},
      {"/rate_hz", 7999, "rate_hz", "found 7999", "from 8000 to 192000"},
      {"/rate_hz", "48k", "rate_hz", "found \"48k\"", "expected a number"},
      {"/rate_hz", kGone, "rate_hz", "missing", "expected a number"},
      {"/recorded_rate_hz", 0, "recorded_rate_hz", "found 0", "from 4000"},
      {"/marker_polarity", 0, "marker_polarity", "found 0", "expected 1 or -1"},
      {"/send", kGone, "send", "missing", "expected an object"},
      {"/return", 1, "return", "found 1", "expected an object"},
      {"/send/channel", 0, "send.channel", "found 0", "whole number from 1"},
      {"/return/channel", 1.5, "return.channel", "found 1.5", "whole number from 1"},
      {"/send/full_scale_v_rms", 0, "send.full_scale_v_rms", "found 0", "expected a number"},
      {"/send/full_scale_v_rms", -8, "send.full_scale_v_rms", "found -8", "expected a number"},
      {"/send/full_scale_v_rms", kGone, "send.full_scale_u_db", "stands without",
       "both or neither"},
      {"/send/full_scale_u_db", kGone, "send.full_scale_u_db", "missing", "expected a number"},
      {"/return/full_scale_u_db", -0.1, "return.full_scale_u_db", "found -0.1", "from 0 to 10"},
      {"/return", json::object(), "return", "has no full_scale_v_rms", "both or neither"},
      {"/send", json::object(), "send", "has no full_scale_v_rms", "both or neither"},
      {"/return/dc_coupled", "yes", "return.dc_coupled", "found \"yes\"", "true or false"},
      {"/reference/channel", kGone, "reference.channel", "missing", "whole number"},
      {"/reference/channel", 4, "reference.channel", "found 4", "another input"},
      {"/reference/tap", "input", "reference.tap", "\"input\"", "terminals, second-output"},
      {"/wiring", "floating", "wiring", "\"floating\"", "one of: balanced"},
      {"/source_impedance_ohm", -1, "source_impedance_ohm", "found -1", "from 0"},
      {"/load_impedance_ohm", 0, "load_impedance_ohm", "found 0", "from 0.1"},
      {"/ceiling_dbfs", 0.5, "ceiling_dbfs", "found 0.5", "from -140 to 0"},
      {"/calibrated_on", "May 2026", "calibrated_on", "found \"May 2026\"", "YYYY-MM-DD"},
      {"/calibrated_on", "2026-13-01", "calibrated_on", "found \"2026-13-01\"", "YYYY-MM-DD"},
      {"/invented", 1, "invented", "found 1", "true or false"},
      {"/floor", json::object(), "floor", "found {}", "a list of objects"},
      {"/floor/1/level_dbfs", 3, "floor[1].level_dbfs", "found 3", "from -140 to 0"},
      {"/floor/1/level_dbfs", -60, "floor[1].level_dbfs", "second time", "one entry for each"},
      {"/floor/2/order", 1, "floor[2].order", "found 1", "from 2 to 20"},
      {"/floor/0/relative_db", 2, "floor[0].relative_db", "found 2", "from -400 to 0"},
      {"/floor/0/relative_db", nullptr, "floor[0].relative_db", "found null", "a number"},
      {"/format", "kneeprint-plan", "format", "\"kneeprint-plan\"", "\"kneeprint-rig\""},
      {"/format", kGone, "format", "missing", "text"},
      {"/version", kGone, "version", "missing", "whole number"},
      {"/version", 0, "version", "found 0", "from 1"},
  };
  for (const Case& c : cases) {
    const std::string text = refusal_with(c.pointer, c.value);
    CAPTURE(text);
    CHECK(text.starts_with("bench.json: field \"" + std::string(c.field) + "\": "));
    CHECK(text.find(c.found) != std::string::npos);
    CHECK(text.find(c.expected) != std::string::npos);
  }
}

TEST_CASE("unknown fields are refused with the known ones beside, at every depth") {
  struct Case {
    const char* pointer;
    const char* field;
    const char* known;
  };
  for (const Case& c : {Case{"/cieling_dbfs", "cieling_dbfs", "ceiling_dbfs"},
                        {"/send/full_scale", "send.full_scale", "full_scale_v_rms"},
                        {"/return/gain", "return.gain", "dc_coupled"},
                        {"/reference/position", "reference.position", "tap"},
                        {"/floor/2/thd", "floor[2].thd", "relative_db"}}) {
    const std::string text = refusal_with(c.pointer, 1);
    CAPTURE(text);
    CHECK(text.starts_with("bench.json: field \"" + std::string(c.field) + "\": unknown field"));
    CHECK(text.find(c.known) != std::string::npos);
  }
}

TEST_CASE("a newer version is refused politely, before its new fields are") {
  json j = example();
  j["version"] = 2;
  j["moon_phase"] = "full";
  const std::string text = refusal(j.dump());
  CHECK(text.starts_with("bench.json: "));
  CHECK(text.find("newer Kneeprint") != std::string::npos);
  CHECK(text.find("moon") == std::string::npos);
}

TEST_CASE("what is no JSON object is refused") {
  for (const char* text : {"", "{", "[]", "7", "null", "\"rig\""}) {
    CAPTURE(text);
    CHECK(refusal(text).starts_with("bench.json: "));
  }
}

TEST_CASE("a file is read, and named when it cannot be") {
  const kneeprint::testing::TemporaryFolder folder;
  const auto file = folder.path() / "rig.json";
  kneeprint::testing::write_bytes(file, rig_json(full_rig()));
  CHECK(rig_json(kneeprint::read_rig(file)) == rig_json(full_rig()));
  const auto missing = folder.path() / "none.json";
  try {
    kneeprint::read_rig(missing);
    FAIL("a missing file was read");
  } catch (const InputError& e) {
    CHECK(std::string(e.what()).find(missing.string()) != std::string::npos);
  }
}

TEST_CASE("the example beside the calibration notes is a rig file") {
  const auto file = std::filesystem::path(__FILE__).parent_path().parent_path().parent_path() /
                    "calibration" / "example-interface.json";
  const Rig rig = kneeprint::read_rig(file);
  CHECK(rig.invented);
  CHECK(rig.kind == RigKind::live);
  CHECK(rig.send_scale.is_calibrated());
  CHECK(rig.return_scale.is_calibrated());
  CHECK(rig.ceiling_dbfs.has_value());
  CHECK(rig.floor.at(LevelDbfs(-20.0), LevelDbfs(-10.0), 2).has_value());
  CHECK(rig.floor.at(LevelDbfs(-20.0), LevelDbfs(-10.0), 3).has_value());
}
