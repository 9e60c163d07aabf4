// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/rig_file.h"

#include <fmt/format.h>

#include <array>
#include <nlohmann/json.hpp>
#include <regex>
#include <set>
#include <tuple>
#include <utility>

#include "platform/json_fields.h"
#include "platform/read_text.h"

namespace kneeprint {
namespace {

constexpr const char* kFormat = "kneeprint-rig";
constexpr int kVersion = 1;

constexpr std::array<std::pair<RigKind, const char*>, 3> kKinds{
    {{RigKind::virtual_rig, "virtual"}, {RigKind::live, "live"}, {RigKind::reel, "reel"}}};
const std::vector<std::string> kTaps{"terminals", "second-output"};
const std::vector<std::string> kWirings{"balanced", "pin 3 grounded", "pin 3 open", "unbalanced"};

const char* kind_name(RigKind kind) {
  for (const auto& [k, text] : kKinds) {
    if (k == kind) return text;
  }
  return "";
}

// To 12 digits (1e-11 dB): the way through decibels and back must not turn 1.23 V into
// 1.2300000000000002 V.
double tidy(double value) { return std::stod(fmt::format("{:.12g}", value)); }

// YYYY-MM-DD, from 1970 on; that the month has such a day is not checked.
bool is_date(const std::string& text) {
  static const std::regex kDate(
      "(19[7-9]|2[0-9]{2})[0-9]-(0[1-9]|1[0-2])-(0[1-9]|[12][0-9]|3[01])");
  return std::regex_match(text, kDate);
}

FloorPoint read_floor_point(const JsonFields& p) {
  p.allow_only({"level_dbfs", "return_dbfs", "frequency_hz", "order", "product", "relative_db",
                "phase_deg"});
  FloorPoint point;
  point.level = LevelDbfs(p.number("level_dbfs", {-140.0, 0.0}));
  if (p.has("return_dbfs")) point.ret = LevelDbfs(p.number("return_dbfs", {-200.0, 6.0}));
  if (p.has("frequency_hz"))
    point.frequency = Hertz(p.number("frequency_hz", {0.0, 90000.0, true}));
  if (p.has("product")) {
    point.order = 0;
    point.product = p.text("product");
    if (p.has("order")) p.refuse("order", "stands beside product; give one of them");
  } else {
    point.order = p.integer("order", 2, 20);
  }
  point.relative = Decibels(p.number("relative_db", {-400.0, 0.0}));
  if (p.has("phase_deg")) point.phase_deg = p.number("phase_deg", {-180.0, 180.0});
  return point;
}

RigFloor read_floor(const JsonFields& f) {
  std::vector<FloorPoint> points;
  std::set<std::tuple<int, std::string, double, double, double>> seen;
  for (const JsonFields& p : f.objects("floor")) {
    points.push_back(read_floor_point(p));
    const FloorPoint& n = points.back();
    if (!seen.insert({n.order, n.product, n.frequency.value(), n.level.value(),
                      n.return_level().value()})
             .second) {
      p.refuse("level_dbfs",
               fmt::format("found {:g} a second time for {}; expected one entry for each pair of "
                           "levels, frequency and line",
                           n.level.value(),
                           n.product.empty() ? fmt::format("order {}", n.order) : n.product));
    }
  }
  return RigFloor(std::move(points));
}

nlohmann::ordered_json floor_json(const RigFloor& floor) {
  auto list = nlohmann::ordered_json::array();
  for (const FloorPoint& p : floor.points()) {
    nlohmann::ordered_json j{{"level_dbfs", p.level.value()}};
    if (p.ret) j["return_dbfs"] = tidy(p.ret->value());
    if (p.frequency.value() > 0.0) j["frequency_hz"] = p.frequency.value();
    if (p.product.empty())
      j["order"] = p.order;
    else
      j["product"] = p.product;
    j["relative_db"] = p.relative.value();
    if (p.phase_deg) j["phase_deg"] = *p.phase_deg;
    list.push_back(std::move(j));
  }
  return list;
}

LoopResponse read_response(const JsonFields& f) {
  f.allow_only({"return_share", "points"});
  std::optional<double> share;
  if (f.has("return_share")) share = f.number("return_share", {0.0, 1.0});
  std::vector<LoopPoint> points;
  for (const JsonFields& p : f.objects("points")) {
    p.allow_only({"frequency_hz", "magnitude_db", "phase_deg"});
    points.push_back({Hertz(p.number("frequency_hz", {0.0, 90000.0, true})),
                      Decibels(p.number("magnitude_db", {-60.0, 60.0})),
                      p.number("phase_deg", {-1e5, 1e5})});
    for (std::size_t i = 0; i + 1 < points.size(); ++i) {
      if (points[i].frequency == points.back().frequency) {
        p.refuse("frequency_hz", fmt::format("found {:g} Hz a second time; expected once",
                                             points.back().frequency.value()));
      }
    }
  }
  return LoopResponse(std::move(points), share);
}

nlohmann::ordered_json response_json(const LoopResponse& response) {
  nlohmann::ordered_json j;
  if (response.return_share()) j["return_share"] = *response.return_share();
  j["points"] = nlohmann::ordered_json::array();
  for (const LoopPoint& p : response.points()) {
    j["points"].push_back({{"frequency_hz", p.frequency.value()},
                           {"magnitude_db", p.magnitude.value()},
                           {"phase_deg", p.phase_deg}});
  }
  return j;
}

nlohmann::ordered_json direction_json(int channel, const LevelScale& scale, bool dc_coupled) {
  nlohmann::ordered_json j;
  j["channel"] = channel;
  if (scale.is_calibrated()) {
    j["full_scale_v_rms"] = tidy(to_volts(LevelDbu(scale.offset_db)).value());
    j["full_scale_u_db"] = scale.standard_uncertainty.value();
  }
  j["dc_coupled"] = dc_coupled;
  return j;
}

struct Direction {
  int channel = 1;
  LevelScale scale;
  bool dc_coupled = false;
};

Direction read_direction(const JsonFields& f) {
  f.allow_only({"channel", "full_scale_v_rms", "full_scale_u_db", "dc_coupled"});
  Direction d;
  if (f.has("channel")) d.channel = f.integer("channel", 1, 256);
  if (f.has("full_scale_v_rms")) {
    const VoltsRms full_scale(f.number("full_scale_v_rms", {1e-4, 1e4}));
    // Without its uncertainty a full scale is no calibration.
    d.scale =
        LevelScale::calibrated(full_scale, Decibels(f.number("full_scale_u_db", {0.0, 10.0})));
  } else if (f.has("full_scale_u_db")) {
    f.refuse("full_scale_u_db", "stands without full_scale_v_rms; give both or neither");
  }
  if (f.has("dc_coupled")) d.dc_coupled = f.boolean("dc_coupled");
  return d;
}

}  // namespace

std::string rig_json(const Rig& rig) {
  nlohmann::ordered_json j;
  j["format"] = kFormat;
  j["version"] = kVersion;
  j["name"] = rig.name;
  j["kind"] = kind_name(rig.kind);
  if (!rig.device.empty()) j["device"] = rig.device;
  j["rate_hz"] = rig.rate.value();
  if (rig.recorded_rate) j["recorded_rate_hz"] = rig.recorded_rate->value();
  if (rig.marker_polarity) j["marker_polarity"] = *rig.marker_polarity;
  j["send"] = direction_json(rig.send_channel, rig.send_scale, rig.dc_coupled_send);
  j["return"] = direction_json(rig.return_channel, rig.return_scale, rig.dc_coupled_return);
  if (rig.reference_channel) {
    j["reference"] = {{"channel", *rig.reference_channel}, {"tap", rig.reference_tap}};
  }
  if (!rig.wiring.empty()) j["wiring"] = rig.wiring;
  if (rig.source_impedance) j["source_impedance_ohm"] = rig.source_impedance->value();
  if (rig.load_impedance) j["load_impedance_ohm"] = rig.load_impedance->value();
  if (rig.ceiling_dbfs) j["ceiling_dbfs"] = *rig.ceiling_dbfs;
  if (!rig.calibrated_on.empty()) j["calibrated_on"] = rig.calibrated_on;
  if (rig.invented) j["invented"] = true;
  if (rig.response.known()) j["response"] = response_json(rig.response);
  if (rig.floor.known()) j["floor"] = floor_json(rig.floor);
  return j.dump(2) + "\n";
}

Rig parse_rig(const std::string& json, const std::string& origin) {
  const nlohmann::json value = parse_json(json, origin);
  const JsonFields f(value, origin);
  f.check_format(kFormat, kVersion);
  f.allow_only({"format", "version", "name", "kind", "device", "rate_hz", "recorded_rate_hz",
                "marker_polarity", "send", "return", "reference", "wiring", "source_impedance_ohm",
                "load_impedance_ohm", "ceiling_dbfs", "calibrated_on", "invented", "response",
                "floor"});
  Rig rig;
  rig.name = f.text("name");
  const std::string kind = f.choice("kind", "kind", {"virtual", "live", "reel"});
  for (const auto& [k, text] : kKinds) {
    if (kind == text) rig.kind = k;
  }
  if (rig.kind == RigKind::live || f.has("device")) rig.device = f.text("device");
  if (rig.kind == RigKind::live && rig.device.empty()) {
    f.refuse("device", "found \"\"; expected the device's index, or text that stands in its name");
  }
  rig.rate = Hertz(f.number("rate_hz", {8000.0, 192000.0}));
  if (f.has("recorded_rate_hz")) {
    rig.recorded_rate = Hertz(f.number("recorded_rate_hz", {4000.0, 1e6}));
  }
  if (f.has("marker_polarity")) {
    rig.marker_polarity = f.integer("marker_polarity", -1, 1);
    if (*rig.marker_polarity == 0) f.refuse("marker_polarity", "found 0; expected 1 or -1");
  }
  const Direction send = read_direction(f.object("send")), ret = read_direction(f.object("return"));
  rig.send_channel = send.channel;
  rig.send_scale = send.scale;
  rig.dc_coupled_send = send.dc_coupled;
  rig.return_channel = ret.channel;
  rig.return_scale = ret.scale;
  rig.dc_coupled_return = ret.dc_coupled;
  if (send.scale.is_calibrated() != ret.scale.is_calibrated()) {
    f.refuse(send.scale.is_calibrated() ? "return" : "send",
             "has no full_scale_v_rms while the other direction has; give both or neither");
  }
  if (f.has("reference")) {
    const JsonFields r = f.object("reference");
    r.allow_only({"channel", "tap"});
    rig.reference_channel = r.integer("channel", 1, 256);
    rig.reference_tap = r.choice("tap", "tap", kTaps);
    if (*rig.reference_channel == rig.return_channel) {
      r.refuse("channel", fmt::format("found {}, the return's own; expected another input",
                                      rig.return_channel));
    }
  }
  if (f.has("wiring")) rig.wiring = f.choice("wiring", "wiring", kWirings);
  if (f.has("source_impedance_ohm")) {
    rig.source_impedance = Ohms(f.number("source_impedance_ohm", {0.0, 1e9}));
  }
  if (f.has("load_impedance_ohm")) {
    rig.load_impedance = Ohms(f.number("load_impedance_ohm", {0.1, 1e12}));
  }
  if (f.has("ceiling_dbfs")) rig.ceiling_dbfs = f.number("ceiling_dbfs", {-140.0, 0.0});
  if (f.has("calibrated_on")) {
    rig.calibrated_on = f.text("calibrated_on");
    if (!is_date(rig.calibrated_on)) {
      f.refuse("calibrated_on",
               fmt::format("found \"{}\"; expected a date as YYYY-MM-DD", rig.calibrated_on));
    }
  }
  if (f.has("invented")) rig.invented = f.boolean("invented");
  if (f.has("response")) rig.response = read_response(f.object("response"));
  if (f.has("floor")) rig.floor = read_floor(f);
  return rig;
}

Rig read_rig(const std::filesystem::path& file) {
  return parse_rig(read_text(file), file.string());
}

}  // namespace kneeprint
