// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/model.h"

#include <doctest/doctest.h>

#include <nlohmann/json.hpp>

#include "quantity/failure.h"
#include "temporary_folder.h"

using namespace kneeprint;
using namespace kneeprint::testing;

namespace {

// Numbers whose shortest decimal form is long, so that a lost digit shows.
Model sample() {
  Model m;
  double next = 0.1;
  const auto number = [&] { return next = next * 1.7 + 1.0 / 3.0; };
  const auto parameter = [&] { return FittedParameter{number(), number(), -number(), number()}; };
  for (const SigmoidFamily& family : sigmoid_families()) {
    FittedFamily f;
    f.family = &family;
    f.limit = parameter();
    f.drive = parameter();
    f.bias = parameter();
    if (family.has_sharpness) f.sharpness = parameter();
    f.chi_square = number();
    f.data = 200;
    f.parameters = 4;
    f.discrepancy = 1.0 / number();
    f.aicc = -number();
    f.reach = 0.7 / 3.0;
    f.extrapolated = family.id == "tanh";
    f.converged = family.id != "erf";
    m.fit.families.push_back(f);
    HoldoutFamily h;
    h.family = family.id;
    h.points = {{"smpte", "m2", -20.0, number(), number(), -number()},
                {"ccif", "d3", 1.0 / 3.0, {}, {}, -number()}};
    h.compared = 1;
    h.rms_error_db = number();
    h.worst_error_db = number();
    m.holdout.push_back(h);
  }
  m.fit.best = 2;
  m.fit.equally_good = {0, 2};
  m.fit.limit_low = number();
  m.fit.limit_high = number();
  m.polarity = -1;
  m.fit_frequency_hz = 996.9993;
  m.axis_unit = "FS";
  m.drive_unit = "dBFS";
  m.frequency_dependent = true;
  m.frequency_checked = true;
  return m;
}

void check_equal(const FittedParameter& a, const FittedParameter& b) {
  CHECK(a.value == b.value);
  CHECK(a.standard_error == b.standard_error);
  CHECK(a.low95 == b.low95);
  CHECK(a.high95 == b.high95);
}

void check_equal(const Model& a, const Model& b) {
  REQUIRE(a.fit.families.size() == b.fit.families.size());
  for (std::size_t i = 0; i < a.fit.families.size(); ++i) {
    const FittedFamily &f = a.fit.families[i], &g = b.fit.families[i];
    CHECK(f.family == g.family);
    check_equal(f.limit, g.limit);
    check_equal(f.drive, g.drive);
    check_equal(f.bias, g.bias);
    REQUIRE(f.sharpness.has_value() == g.sharpness.has_value());
    if (f.sharpness) check_equal(*f.sharpness, *g.sharpness);
    CHECK(f.chi_square == g.chi_square);
    CHECK(f.data == g.data);
    CHECK(f.parameters == g.parameters);
    CHECK(f.discrepancy == g.discrepancy);
    CHECK(f.aicc == g.aicc);
    CHECK(f.reach == g.reach);
    CHECK(f.extrapolated == g.extrapolated);
    CHECK(f.converged == g.converged);
  }
  CHECK(a.fit.best == b.fit.best);
  CHECK(a.fit.equally_good == b.fit.equally_good);
  CHECK(a.fit.limit_low == b.fit.limit_low);
  CHECK(a.fit.limit_high == b.fit.limit_high);
  CHECK(a.polarity == b.polarity);
  CHECK(a.fit_frequency_hz == b.fit_frequency_hz);
  CHECK(a.axis_unit == b.axis_unit);
  CHECK(a.drive_unit == b.drive_unit);
  CHECK(a.frequency_dependent == b.frequency_dependent);
  CHECK(a.frequency_checked == b.frequency_checked);
  REQUIRE(a.holdout.size() == b.holdout.size());
  for (std::size_t i = 0; i < a.holdout.size(); ++i) {
    const HoldoutFamily &h = a.holdout[i], &k = b.holdout[i];
    CHECK(h.family == k.family);
    CHECK(h.compared == k.compared);
    CHECK(h.rms_error_db == k.rms_error_db);
    CHECK(h.worst_error_db == k.worst_error_db);
    REQUIRE(h.points.size() == k.points.size());
    for (std::size_t j = 0; j < h.points.size(); ++j) {
      CHECK(h.points[j].method == k.points[j].method);
      CHECK(h.points[j].product == k.points[j].product);
      CHECK(h.points[j].drive == k.points[j].drive);
      CHECK(h.points[j].measured_db == k.points[j].measured_db);
      CHECK(h.points[j].expanded_u_db == k.points[j].expanded_u_db);
      CHECK(h.points[j].predicted_db == k.points[j].predicted_db);
    }
  }
}

/// What read_model says to the sample after `change`.
std::string complaint(void (*change)(nlohmann::json&)) {
  const TemporaryFolder folder;
  const auto file = folder.path() / "model.json";
  nlohmann::json j = nlohmann::json::parse(model_json(sample()));
  change(j);
  write_bytes(file, j.dump());
  try {
    read_model(file);
  } catch (const InputError& e) {
    return e.what();
  }
  return "";
}

bool mentions(const std::string& text, const std::string& part) {
  return text.find(part) != std::string::npos;
}

}  // namespace

TEST_CASE("a model written and read back is equal to the last bit") {
  const TemporaryFolder folder;
  const auto file = folder.path() / "model.json";
  const Model model = sample();
  write_bytes(file, model_json(model));
  const Model read = read_model(file);
  check_equal(model, read);
  CHECK(model_json(read) == model_json(model));
  CHECK(model_json(sample()) == model_json(model));
}

TEST_CASE("a model without two-tone takes has no hold-out") {
  const TemporaryFolder folder;
  const auto file = folder.path() / "model.json";
  Model model = sample();
  model.holdout.clear();
  write_bytes(file, model_json(model));
  CHECK(read_model(file).holdout.empty());
}

TEST_CASE("the fields that scripts rely on") {
  const nlohmann::json j = nlohmann::json::parse(model_json(sample()));
  CHECK(j["format"] == "kneeprint-model");
  CHECK(j["version"] == 1);
  CHECK(j["best"]["family"] == "algebraic");
  CHECK(j["best"]["polarity"] == -1);
  const Model m = sample();
  for (const char* name : {"limit", "drive", "bias", "sharpness"}) {
    CAPTURE(name);
    const nlohmann::json& p = j["best"]["parameters"][name];
    CHECK(p["value"].is_number());
    CHECK(p["standard_error"].is_number());
    CHECK(p["interval95"].size() == 2);
  }
  CHECK(j["best"]["parameters"]["limit"]["value"] == m.fit.families[2].limit.value);
  CHECK(j["best"]["parameters"]["limit"]["unit"] == "FS");
  CHECK(j["best"]["parameters"]["drive"]["unit"] == "1/FS");
  for (const SigmoidFamily& family : sigmoid_families()) {
    const nlohmann::json& f = j["families"][std::string(family.id)];
    CHECK(f["aicc"].is_number());
    CHECK(f["parameters"]["sharpness"]["value"].is_number() == family.has_sharpness);
    CHECK(j["holdout"][std::string(family.id)]["points"].size() == 2);
  }
  CHECK(j["families"]["tanh"]["parameters"]["sharpness"]["value"].is_null());
}

TEST_CASE("a refusal names the file and the field") {
  const auto check = [](void (*change)(nlohmann::json&), const char* field) {
    CAPTURE(field);
    const std::string said = complaint(change);
    CAPTURE(said);
    CHECK(mentions(said, "model.json"));
    CHECK(mentions(said, field));
  };
  using Json = nlohmann::json;
  check([](Json& j) { j["format"] = "kneeprint-plan"; }, "\"format\"");
  check([](Json& j) { j["version"] = 2; }, "newer");
  check([](Json& j) { j.erase("best"); }, "\"best\"");
  check([](Json& j) { j["best"]["family"] = "polynomial"; }, "\"best.family\"");
  check([](Json& j) { j["best"]["polarity"] = 3; }, "\"best.polarity\"");
  check([](Json& j) { j["families"]["tanh"].erase("aicc"); }, "\"families.tanh.aicc\"");
  check([](Json& j) { j["families"]["spline"] = j["families"]["tanh"]; }, "\"families.spline\"");
  check([](Json& j) { j["families"]["erf"]["converged"] = 1; }, "\"families.erf.converged\"");
  check([](Json& j) { j["families"]["atan"]["parameters"]["bias"]["value"] = "0.2"; },
        "\"families.atan.parameters.bias.value\"");
  check([](Json& j) { j["families"]["atan"]["parameters"]["bias"]["interval95"] = {1.0}; },
        "\"families.atan.parameters.bias.interval95\"");
  check([](Json& j) { j["equally_good"] = {"cubic"}; }, "\"equally_good\"");
  check([](Json& j) { j["holdout"]["tanh"]["points"][1]["drive"] = nullptr; },
        "\"holdout.tanh.points[1].drive\"");
  const TemporaryFolder folder;
  CHECK_THROWS_AS(read_model(folder.path() / "none.json"), InputError);
}
