// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/csv.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <random>

#include "quantity/failure.h"
#include "temporary_folder.h"

namespace kneeprint {
namespace {

constexpr Flag kFlags[] = {Flag::none,  Flag::floor,   Flag::noise,
                           Flag::alias, Flag::clipped, Flag::unsteady};

/// Doubles of every size, with all their digits.
class Numbers {
 public:
  double operator()() {
    return std::ldexp(std::uniform_real_distribution<double>(-1.0, 1.0)(engine_),
                      std::uniform_int_distribution<int>(-60, 60)(engine_));
  }
  Cell cell() { return engine_() % 4 == 0 ? Cell() : Cell((*this)()); }
  int whole() { return std::uniform_int_distribution<int>(-5, 1000)(engine_); }
  Flag flag() { return kFlags[engine_() % 6]; }
  LevelUnit unit() { return engine_() % 2 == 0 ? LevelUnit::dbu : LevelUnit::dbfs; }

 private:
  std::mt19937_64 engine_{20240501};
};

Curves any_curves(int rows) {
  Numbers any;
  Curves c;
  for (int i = 0; i < rows; ++i) {
    c.levels.push_back({any(),      any(),       any.unit(),  any.cell(), any.cell(), any.cell(),
                        any.cell(), any.cell(),  any.whole(), any.cell(), any.cell(), any.cell(),
                        any.cell(), any.flag(),  any.cell(),  any.cell(), any.cell(), any.cell(),
                        any.cell(), any.cell(),  any.cell(),  any.cell(), any.cell(), any.cell(),
                        any(),      any.whole(), any()});
    c.harmonics.push_back({any(), any(), any.unit(), any.whole(), any.cell(), any.cell(),
                           any.cell(), any.cell(), any.cell(), any.flag(), any.cell(), any.cell(),
                           any.cell(), any(), any(), any(), i % 2 == 0 ? kInfiniteDof : any()});
    c.intermods.push_back({"smpte", any(), any(), any(), any.unit(), i % 2 == 0 ? "m2" : "total",
                           any.cell(), any.cell(), any.cell(), any.cell(), any.flag(), any.cell(),
                           any.cell(), any.whole(), any(), any()});
    c.responses.push_back(
        {any(), any(), any.unit(), any.whole(), any.cell(), any.cell(), any.cell(), any.flag()});
    c.products.push_back({"smpte", any(), any(), any(), any.unit(), any.whole(), any.whole(),
                          any.whole(), any(), any.cell(), any.cell(), any.cell(), any.cell(),
                          any.flag(), "falls on 2f2-f1"});
    c.glides.push_back({any(), i % 2 == 0 ? "up" : "down", any(), any.unit(), any.whole(),
                        any.cell(), any.cell(), any.cell(), any.cell(), any.cell(), any.flag()});
    c.scalars.push_back({"silence", any.cell(), any.cell(), any.unit(), "noise-a", "-", any.cell(),
                         "dBu", any.cell(), any.cell(), any.flag()});
    c.traces.push_back({"burst", any.cell(), any.unit(), "gain", any(), "s", any.cell(), "dB",
                        any.cell(), any.flag()});
  }
  return c;
}

class CurvesFolder {
 public:
  explicit CurvesFolder(const Curves& c) {
    for (const CsvTable& table : csv_tables()) write(table.file, table.text(c));
  }
  void write(std::string_view name, const std::string& text) const {
    testing::write_bytes(path() / name, text);
  }
  const std::filesystem::path& path() const { return folder_.path(); }
  Curves read() const { return read_curves(path()); }
  /// The message with which `name` is refused when it holds `text`.
  std::string refusal(const char* name, const std::string& text) const {
    write(name, text);
    try {
      read();
    } catch (const InputError& e) {
      const std::string message = e.what(), file = (path() / name).string() + ": ";
      REQUIRE(message.starts_with(file));
      return message.substr(file.size());
    }
    return "(accepted)";
  }

 private:
  testing::TemporaryFolder folder_;
};

const char* const kResponseHeader =
    "frequency_hz,drive,level_unit,order,magnitude_db,phase_deg,expanded_u_db,flag,method";

}  // namespace

TEST_CASE("headers: the columns that scripts rely on, then the further ones") {
  const Curves none;
  CHECK(levels_csv(none) ==
        "frequency_hz,drive,level_unit,output,gain_db,gain_u_db,thd_f_percent,thd_r_percent,"
        "thd_orders,thdn_percent,dc,noise,even_odd_db,flag,output_u_db,thd_f_u_percent,"
        "thd_r_u_percent,thdn_u_percent,dc_u,noise_u_db,even_odd_u_db,sinad_db,sinad_u_db,polarity,"
        "asked_hz,blocks,settled_after_s,direction,integration\n");
  CHECK(harmonics_csv(none) ==
        "frequency_hz,drive,level_unit,order,level,relative_db,phase_deg,expanded_u_db,floor_db,"
        "flag,level_u_db,relative_low_db,relative_high_db,in_phase,quadrature,component_u,dof,"
        "direction\n");
  CHECK(intermod_csv(none) ==
        "method,f1_hz,f2_hz,drive,level_unit,product,percent,db,expanded_u_db,floor_db,flag,"
        "am_percent,pm_percent,blocks,settled_after_s,ratio\n");
  CHECK(response_csv(none) == std::string(kResponseHeader) + "\n");
  const auto text = [&](std::string_view file) {
    const auto tables = csv_tables();
    return std::find_if(tables.begin(), tables.end(), [&](auto& t) { return t.file == file; })
        ->text(none);
  };
  CHECK(text("products.csv") ==
        "method,f1_hz,f2_hz,drive,level_unit,k1,k2,order,frequency_hz,level,relative_db,phase_deg,"
        "expanded_u_db,flag,note\n");
  CHECK(text("glide.csv") ==
        "frequency_hz,direction,drive,level_unit,order,level,relative_db,phase_deg,expanded_u_db,"
        "floor_db,flag\n");
  CHECK(text("scalars.csv") ==
        "method,frequency_hz,drive,level_unit,figure,state,value,value_unit,expanded_u,floor,"
        "flag\n");
  CHECK(text("traces.csv") ==
        "method,drive,level_unit,trace,x,x_unit,value,value_unit,expanded_u,flag\n");
}

TEST_CASE("a row, cell by cell") {
  Curves c;
  HarmonicPoint h;
  h.frequency_hz = 997.0;
  h.drive = -10.1;
  h.unit = LevelUnit::dbu;
  h.order = 3;
  h.level = -60.25;
  h.relative_db = -50.0;
  h.phase_deg = 180.0;
  h.flag = Flag::floor;
  h.in_phase = 1e-7;
  h.component_u = 0.1 + 0.2;
  c.harmonics.push_back(h);
  CHECK(harmonics_csv(c).substr(harmonics_csv({}).size()) ==
        "997,-10.1,dBu,3,-60.25,-50,180,,,floor,,,,1e-07,0,0.30000000000000004,inf,up\n");
}

TEST_CASE("every double, cell, flag and unit comes back, and the bytes with them") {
  const Curves c = any_curves(500);
  const Curves back = CurvesFolder(c).read();
  CHECK(levels_csv(back) == levels_csv(c));
  CHECK(harmonics_csv(back) == harmonics_csv(c));
  CHECK(intermod_csv(back) == intermod_csv(c));
  for (const CsvTable& table : csv_tables()) CHECK(table.text(back) == table.text(c));
  // Equal bytes would not show two columns bound to one member: compare the members themselves.
  REQUIRE(back.harmonics.size() == 500);
  int different = 0;
  for (std::size_t i = 0; i < 500; ++i) {
    const LevelPoint &l = c.levels[i], &m = back.levels[i];
    different +=
        l.frequency_hz != m.frequency_hz || l.drive != m.drive || l.unit != m.unit ||
        l.output != m.output || l.gain_db != m.gain_db || l.gain_u_db != m.gain_u_db ||
        l.thd_f_percent != m.thd_f_percent || l.thd_r_percent != m.thd_r_percent ||
        l.thd_orders != m.thd_orders || l.thdn_percent != m.thdn_percent || l.dc != m.dc ||
        l.noise != m.noise || l.even_odd_db != m.even_odd_db || l.flag != m.flag ||
        l.output_u_db != m.output_u_db || l.thd_f_u_percent != m.thd_f_u_percent ||
        l.thd_r_u_percent != m.thd_r_u_percent || l.thdn_u_percent != m.thdn_u_percent ||
        l.dc_u != m.dc_u || l.noise_u_db != m.noise_u_db || l.even_odd_u_db != m.even_odd_u_db ||
        l.sinad_db != m.sinad_db || l.sinad_u_db != m.sinad_u_db || l.polarity != m.polarity ||
        l.asked_hz != m.asked_hz || l.blocks != m.blocks || l.settled_after_s != m.settled_after_s;
    const HarmonicPoint &h = c.harmonics[i], &g = back.harmonics[i];
    different += h.frequency_hz != g.frequency_hz || h.drive != g.drive || h.unit != g.unit ||
                 h.order != g.order || h.level != g.level || h.relative_db != g.relative_db ||
                 h.phase_deg != g.phase_deg || h.expanded_u_db != g.expanded_u_db ||
                 h.floor_db != g.floor_db || h.flag != g.flag || h.level_u_db != g.level_u_db ||
                 h.relative_low_db != g.relative_low_db ||
                 h.relative_high_db != g.relative_high_db || h.in_phase != g.in_phase ||
                 h.quadrature != g.quadrature || h.component_u != g.component_u || h.dof != g.dof;
    const IntermodPoint &p = c.intermods[i], &q = back.intermods[i];
    different += p.method != q.method || p.f1_hz != q.f1_hz || p.f2_hz != q.f2_hz ||
                 p.drive != q.drive || p.unit != q.unit || p.product != q.product ||
                 p.percent != q.percent || p.db != q.db || p.expanded_u_db != q.expanded_u_db ||
                 p.floor_db != q.floor_db || p.flag != q.flag || p.am_percent != q.am_percent ||
                 p.pm_percent != q.pm_percent || p.blocks != q.blocks ||
                 p.settled_after_s != q.settled_after_s || p.ratio != q.ratio;
    const ResponsePoint &r = c.responses[i], &s = back.responses[i];
    different += r.frequency_hz != s.frequency_hz || r.drive != s.drive || r.unit != s.unit ||
                 r.order != s.order || r.magnitude_db != s.magnitude_db ||
                 r.phase_deg != s.phase_deg || r.expanded_u_db != s.expanded_u_db ||
                 r.flag != s.flag;
  }
  CHECK(different == 0);
}

TEST_CASE("empty tables come back empty") {
  const Curves back = CurvesFolder({}).read();
  CHECK(back.levels.empty());
  CHECK(back.harmonics.empty());
  CHECK(back.intermods.empty());
  CHECK(back.responses.empty());
}

TEST_CASE("every flag has a name that leads back to it") {
  for (const Flag flag : kFlags) CHECK(flag_named(name(flag)) == flag);
  CHECK(name(Flag::none).empty());
  CHECK_FALSE(flag_named("Floor"));
  CHECK_FALSE(flag_named(" "));
}

TEST_CASE("a figure that no table may hold is not written") {
  Curves c = any_curves(1);
  c.harmonics[0].level = std::numeric_limits<double>::quiet_NaN();
  CHECK_THROWS_AS(harmonics_csv(c), std::logic_error);
  c.harmonics[0].level = -std::numeric_limits<double>::infinity();
  CHECK_THROWS_AS(harmonics_csv(c), std::logic_error);
  c.harmonics[0].level = 0.0;
  c.harmonics[0].dof = std::numeric_limits<double>::quiet_NaN();
  CHECK_THROWS_AS(harmonics_csv(c), std::logic_error);
  c.intermods[0].method = "a,b";
  CHECK_THROWS_AS(intermod_csv(c), std::logic_error);
}

TEST_CASE("a refused table names file, row and column") {
  const CurvesFolder folder{Curves{}};
  const auto refusal = [&](const std::string& rows) {
    return folder.refusal("response.csv", std::string(kResponseHeader) + "\n" + rows);
  };
  const std::string good = "997,-10,dBu,1,0.5,,0.01,floor,steady\n";
  CHECK(refusal(good) == "(accepted)");
  CHECK(refusal(good + "997,-10,dBu,1,0.5,,0.01,\n") == "row 3: found 8 cells; expected 9");
  CHECK(refusal(good + "\n") == "row 3: found 1 cells; expected 9");
  CHECK(refusal("997,-10,dBu,1,0.5,,0.01,floor,steady,\n") == "row 2: found 10 cells; expected 9");
  CHECK(refusal(good + "997,loud,dBu,1,0.5,,0.01,,steady\n") ==
        "row 3, column 2 \"drive\": found \"loud\"; expected a number");
  CHECK(refusal("997,,dBu,1,0.5,,0.01,,steady\n") ==
        "row 2, column 2 \"drive\": found \"\"; expected a number");
  CHECK(refusal("997,-10,dBu,1,0.5 dB,,0.01,,steady\n") ==
        "row 2, column 5 \"magnitude_db\": found \"0.5 dB\"; expected a number or an empty cell");
  CHECK(refusal("997,-10,dBu,1.5,0.5,,0.01,,steady\n") ==
        "row 2, column 4 \"order\": found \"1.5\"; expected a whole number");
  CHECK(refusal("997,-10,dBm,1,0.5,,0.01,,steady\n") ==
        "row 2, column 3 \"level_unit\": found \"dBm\"; expected dBFS or dBu");
  CHECK(refusal("997,-10,dBu,1,0.5,,0.01,fine,steady\n") ==
        "row 2, column 8 \"flag\": found \"fine\"; expected an empty cell, floor, noise, alias, "
        "clipped or unsteady");
  for (const char* number : {"nan", "inf", "-inf", "1e999", "+1", " 1", "0x10", "1,0", "\"1\""}) {
    CAPTURE(number);
    CHECK(
        refusal(std::string("997,-10,dBu,1,") + number + ",,0.01,,steady\n").starts_with("row 2"));
  }
  CHECK(refusal("997,-10,dBu,1,0.5,,0.01,,steady") ==
        "the last row is unfinished; expected it to end in a newline");
  CHECK(folder.refusal("response.csv", "") ==
        "the last row is unfinished; expected it to end in a newline");
  CHECK(folder.refusal("response.csv", "frequency_hz,drive\n") ==
        "row 1: found the header \"frequency_hz,drive\"; expected \"" +
            std::string(kResponseHeader) + "\"");
}

TEST_CASE("infinite degrees of freedom are read, other infinities are not") {
  Curves c = any_curves(1);
  c.harmonics[0].dof = kInfiniteDof;
  const CurvesFolder folder(c);
  CHECK(folder.read().harmonics[0].dof == kInfiniteDof);
  std::string text = harmonics_csv(c);
  text.insert(text.begin() + static_cast<long>(text.rfind("inf")), '-');
  CHECK(folder.refusal("harmonics.csv", text) ==
        "row 2, column 17 \"dof\": found \"-inf\"; expected a number or inf");
}

TEST_CASE("an intermodulation row names its method and product") {
  const CurvesFolder folder{Curves{}};
  CHECK(folder.refusal("intermod.csv", intermod_csv({}) + ",60,7000,0,dBu,m2,,,,,,,,4,0,4\n") ==
        "row 2, column 1 \"method\": found \"\"; expected a name");
}

TEST_CASE("a missing table is named with the reason") {
  const CurvesFolder folder{Curves{}};
  const std::filesystem::path file = folder.path() / "harmonics.csv";
  std::filesystem::remove(file);
  CHECK_THROWS_WITH_AS(folder.read(),
                       (file.string() + ": cannot be read: No such file or directory").c_str(),
                       InputError);
}

}  // namespace kneeprint
