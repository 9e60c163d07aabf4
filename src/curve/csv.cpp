// SPDX-License-Identifier: GPL-3.0-or-later
// Each table is one list of columns, a name and a member of its row; the header, the writing and
// the reading all follow from that list.
#include "curve/csv.h"

#include <fmt/format.h>

#include <array>
#include <charconv>
#include <cmath>
#include <span>
#include <stdexcept>
#include <string>
#include <string_view>
#include <variant>
#include <vector>

#include "platform/read_text.h"
#include "quantity/failure.h"

namespace kneeprint {
namespace {

template <class Row>
struct Column {
  std::string_view name;
  std::variant<double Row::*, Cell Row::*, int Row::*, std::string Row::*, LevelUnit Row::*,
               Flag Row::*>
      member;
  bool may_be_infinite = false;
};

// The columns up to `flag` are the interface that scripts rely on; further ones follow it.

template <class Row>
std::span<const Column<Row>> columns();

template <>
std::span<const Column<LevelPoint>> columns() {
  using P = LevelPoint;
  static const std::vector<Column<P>> list{
      {"frequency_hz", &P::frequency_hz},
      {"drive", &P::drive},
      {"level_unit", &P::unit},
      {"output", &P::output},
      {"gain_db", &P::gain_db},
      {"gain_u_db", &P::gain_u_db},
      {"thd_f_percent", &P::thd_f_percent},
      {"thd_r_percent", &P::thd_r_percent},
      {"thd_orders", &P::thd_orders},
      {"thdn_percent", &P::thdn_percent},
      {"dc", &P::dc},
      {"noise", &P::noise},
      {"even_odd_db", &P::even_odd_db},
      {"flag", &P::flag},
      {"output_u_db", &P::output_u_db},
      {"thd_f_u_percent", &P::thd_f_u_percent},
      {"thd_r_u_percent", &P::thd_r_u_percent},
      {"thdn_u_percent", &P::thdn_u_percent},
      {"dc_u", &P::dc_u},
      {"noise_u_db", &P::noise_u_db},
      {"even_odd_u_db", &P::even_odd_u_db},
      {"sinad_db", &P::sinad_db},
      {"sinad_u_db", &P::sinad_u_db},
      {"polarity", &P::polarity},
      {"asked_hz", &P::asked_hz},
      {"blocks", &P::blocks},
      {"settled_after_s", &P::settled_after_s},
      {"direction", &P::direction},
      {"integration", &P::integration},
  };
  return list;
}

template <>
std::span<const Column<HarmonicPoint>> columns() {
  using P = HarmonicPoint;
  static const std::vector<Column<P>> list{
      {"frequency_hz", &P::frequency_hz},
      {"drive", &P::drive},
      {"level_unit", &P::unit},
      {"order", &P::order},
      {"level", &P::level},
      {"relative_db", &P::relative_db},
      {"phase_deg", &P::phase_deg},
      {"expanded_u_db", &P::expanded_u_db},
      {"floor_db", &P::floor_db},
      {"flag", &P::flag},
      {"level_u_db", &P::level_u_db},
      {"relative_low_db", &P::relative_low_db},
      {"relative_high_db", &P::relative_high_db},
      {"in_phase", &P::in_phase},
      {"quadrature", &P::quadrature},
      {"component_u", &P::component_u},
      {"dof", &P::dof, true},
      {"direction", &P::direction},
  };
  return list;
}

template <>
std::span<const Column<IntermodPoint>> columns() {
  using P = IntermodPoint;
  static const std::vector<Column<P>> list{
      {"method", &P::method},
      {"f1_hz", &P::f1_hz},
      {"f2_hz", &P::f2_hz},
      {"drive", &P::drive},
      {"level_unit", &P::unit},
      {"product", &P::product},
      {"percent", &P::percent},
      {"db", &P::db},
      {"expanded_u_db", &P::expanded_u_db},
      {"floor_db", &P::floor_db},
      {"flag", &P::flag},
      {"am_percent", &P::am_percent},
      {"pm_percent", &P::pm_percent},
      {"blocks", &P::blocks},
      {"settled_after_s", &P::settled_after_s},
      {"ratio", &P::ratio},
  };
  return list;
}

template <>
std::span<const Column<ResponsePoint>> columns() {
  using P = ResponsePoint;
  static const std::vector<Column<P>> list{
      {"frequency_hz", &P::frequency_hz},
      {"drive", &P::drive},
      {"level_unit", &P::unit},
      {"order", &P::order},
      {"magnitude_db", &P::magnitude_db},
      {"phase_deg", &P::phase_deg},
      {"expanded_u_db", &P::expanded_u_db},
      {"flag", &P::flag},
      {"method", &P::method},
  };
  return list;
}

template <>
std::span<const Column<ProductPoint>> columns() {
  using P = ProductPoint;
  static const std::vector<Column<P>> list{
      {"method", &P::method},
      {"f1_hz", &P::f1_hz},
      {"f2_hz", &P::f2_hz},
      {"drive", &P::drive},
      {"level_unit", &P::unit},
      {"k1", &P::k1},
      {"k2", &P::k2},
      {"order", &P::order},
      {"frequency_hz", &P::frequency_hz},
      {"level", &P::level},
      {"relative_db", &P::relative_db},
      {"phase_deg", &P::phase_deg},
      {"expanded_u_db", &P::expanded_u_db},
      {"flag", &P::flag},
      {"note", &P::note},
  };
  return list;
}

template <>
std::span<const Column<GlidePoint>> columns() {
  using P = GlidePoint;
  static const std::vector<Column<P>> list{
      {"frequency_hz", &P::frequency_hz},
      {"direction", &P::direction},
      {"drive", &P::drive},
      {"level_unit", &P::unit},
      {"order", &P::order},
      {"level", &P::level},
      {"relative_db", &P::relative_db},
      {"phase_deg", &P::phase_deg},
      {"expanded_u_db", &P::expanded_u_db},
      {"floor_db", &P::floor_db},
      {"flag", &P::flag},
  };
  return list;
}

template <>
std::span<const Column<ScalarPoint>> columns() {
  using P = ScalarPoint;
  static const std::vector<Column<P>> list{
      {"method", &P::method},
      {"frequency_hz", &P::frequency_hz},
      {"drive", &P::drive},
      {"level_unit", &P::unit},
      {"figure", &P::figure},
      {"state", &P::state},
      {"value", &P::value},
      {"value_unit", &P::value_unit},
      {"expanded_u", &P::expanded_u},
      {"floor", &P::floor},
      {"flag", &P::flag},
  };
  return list;
}

template <>
std::span<const Column<TracePoint>> columns() {
  using P = TracePoint;
  static const std::vector<Column<P>> list{
      {"method", &P::method},
      {"drive", &P::drive},
      {"level_unit", &P::unit},
      {"trace", &P::trace},
      {"x", &P::x},
      {"x_unit", &P::x_unit},
      {"value", &P::value},
      {"value_unit", &P::value_unit},
      {"expanded_u", &P::expanded_u},
      {"flag", &P::flag},
  };
  return list;
}

// Writing. A cell that could not be read back is our own mistake, and no file's.

std::string text_of(double x, bool may_be_infinite) {
  if (!std::isfinite(x) && !(may_be_infinite && x > 0.0)) {
    throw std::logic_error(fmt::format("the figure is {}, which no table may hold", x));
  }
  return fmt::format("{}", x);
}
std::string text_of(const Cell& x, bool may_be_infinite) {
  return x ? text_of(*x, may_be_infinite) : "";
}
std::string text_of(int x, bool) { return fmt::format("{}", x); }
std::string text_of(const std::string& x, bool) {
  if (x.find_first_of(",\"\r\n") != x.npos) {
    throw std::logic_error(fmt::format("the text '{}' does not fit a cell", x));
  }
  return x;
}
std::string text_of(LevelUnit x, bool) { return std::string(name(x)); }
std::string text_of(Flag x, bool) { return std::string(name(x)); }

template <class Row>
std::string header() {
  std::string line;
  for (const Column<Row>& column : columns<Row>()) {
    if (!line.empty()) line += ',';
    line += column.name;
  }
  return line;
}

template <class Row>
std::string table(const std::vector<Row>& rows) {
  std::string text = header<Row>() + "\n";
  for (const Row& row : rows) {
    bool first = true;
    for (const Column<Row>& column : columns<Row>()) {
      if (!first) text += ',';
      first = false;
      text += std::visit([&](auto member) { return text_of(row.*member, column.may_be_infinite); },
                         column.member);
    }
    text += '\n';
  }
  return text;
}

// Reading. Each answers what it expected when the cell is something else, and nothing when it is
// read.

using Expected = std::string;

Expected read_cell(std::string_view cell, bool may_be_infinite, double& x) {
  const auto [end, error] = std::from_chars(cell.data(), cell.data() + cell.size(), x);
  const bool whole = error == std::errc() && end == cell.data() + cell.size();
  if (whole && (std::isfinite(x) || (may_be_infinite && cell == "inf"))) return "";
  return may_be_infinite ? "a number or inf" : "a number";
}
Expected read_cell(std::string_view cell, bool may_be_infinite, Cell& x) {
  if (cell.empty()) return "";
  const Expected problem = read_cell(cell, may_be_infinite, x.emplace());
  return problem.empty() ? "" : problem + " or an empty cell";
}
Expected read_cell(std::string_view cell, bool, int& x) {
  const auto [end, error] = std::from_chars(cell.data(), cell.data() + cell.size(), x);
  return error == std::errc() && end == cell.data() + cell.size() ? "" : "a whole number";
}
Expected read_cell(std::string_view cell, bool, std::string& x) {
  x = cell;
  return cell.empty() ? "a name" : "";
}
Expected read_cell(std::string_view cell, bool, LevelUnit& x) {
  for (const LevelUnit unit : {LevelUnit::dbfs, LevelUnit::dbu}) {
    if (cell != name(unit)) continue;
    x = unit;
    return "";
  }
  return "dBFS or dBu";
}
Expected read_cell(std::string_view cell, bool, Flag& x) {
  const std::optional<Flag> flag = flag_named(cell);
  if (!flag) return "an empty cell, floor, noise, alias, clipped or unsteady";
  x = *flag;
  return "";
}

std::vector<std::string_view> split(std::string_view line) {
  std::vector<std::string_view> cells;
  for (;;) {
    const std::size_t comma = line.find(',');
    cells.push_back(line.substr(0, comma));
    if (comma == line.npos) return cells;
    line.remove_prefix(comma + 1);
  }
}

template <class Row>
Row read_row(std::string_view line, const std::string& where) {
  const std::span<const Column<Row>> expected = columns<Row>();
  const std::vector<std::string_view> cells = split(line);
  if (cells.size() != expected.size()) {
    throw InputError(
        fmt::format("{}: found {} cells; expected {}", where, cells.size(), expected.size()));
  }
  Row row;
  for (std::size_t i = 0; i < cells.size(); ++i) {
    const Column<Row>& column = expected[i];
    const Expected problem = std::visit(
        [&](auto member) { return read_cell(cells[i], column.may_be_infinite, row.*member); },
        column.member);
    if (!problem.empty()) {
      throw InputError(fmt::format("{}, column {} \"{}\": found \"{}\"; expected {}", where, i + 1,
                                   column.name, cells[i], problem));
    }
  }
  return row;
}

template <class Row>
std::vector<Row> read_table(const std::filesystem::path& file) {
  const std::string text = read_text(file);
  if (text.empty() || text.back() != '\n') {
    throw InputError(fmt::format("{}: the last row is unfinished; expected it to end in a newline",
                                 file.string()));
  }
  std::vector<Row> rows;
  std::string_view rest = text;
  for (int number = 1; !rest.empty(); ++number) {
    const std::string_view line = rest.substr(0, rest.find('\n'));
    const std::string where = fmt::format("{}: row {}", file.string(), number);
    if (number > 1) {
      rows.push_back(read_row<Row>(line, where));
    } else if (line != header<Row>()) {
      throw InputError(
          fmt::format("{}: found the header \"{}\"; expected \"{}\"", where, line, header<Row>()));
    }
    rest.remove_prefix(line.size() + 1);
  }
  return rows;
}

}  // namespace

std::string levels_csv(const Curves& c) { return table(c.levels); }
std::string harmonics_csv(const Curves& c) { return table(c.harmonics); }
std::string intermod_csv(const Curves& c) { return table(c.intermods); }
std::string response_csv(const Curves& c) { return table(c.responses); }

std::span<const CsvTable> csv_tables() {
  static constexpr std::array kTables{
      CsvTable{"levels.csv", levels_csv},
      CsvTable{"harmonics.csv", harmonics_csv},
      CsvTable{"intermod.csv", intermod_csv},
      CsvTable{"response.csv", response_csv},
      CsvTable{"products.csv", [](const Curves& c) { return table(c.products); }},
      CsvTable{"glide.csv", [](const Curves& c) { return table(c.glides); }},
      CsvTable{"scalars.csv", [](const Curves& c) { return table(c.scalars); }},
      CsvTable{"traces.csv", [](const Curves& c) { return table(c.traces); }},
  };
  return kTables;
}

Curves read_curves(const std::filesystem::path& folder) {
  return {read_table<LevelPoint>(folder / "levels.csv"),
          read_table<HarmonicPoint>(folder / "harmonics.csv"),
          read_table<IntermodPoint>(folder / "intermod.csv"),
          read_table<ResponsePoint>(folder / "response.csv"),
          read_table<ProductPoint>(folder / "products.csv"),
          read_table<GlidePoint>(folder / "glide.csv"),
          read_table<ScalarPoint>(folder / "scalars.csv"),
          read_table<TracePoint>(folder / "traces.csv")};
}

}  // namespace kneeprint
