// SPDX-License-Identifier: GPL-3.0-or-later
// Tables of figures that are single numbers: noise and hum, multitone and fill, memory and drift.
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <map>
#include <set>
#include <utility>

#include "report/number_text.h"
#include "report/report_facts.h"
#include "report/report_sections.h"

namespace kneeprint {
namespace {

using Names = std::vector<std::pair<std::string, std::string>>;  // id and what a reader calls it

std::string value_text(const ScalarPoint& p) {
  if (!p.value) return kDash;
  if (p.flag == Flag::noise) return "< " + short_text(*p.value, 3);
  return with_u(p.value, p.expanded_u, 2);
}

/// Finer than 0.01 is no news to a reader of tables, and stands in scalars.csv.
std::string coarse_text(const ScalarPoint& p) {
  constexpr double kFinest = 0.01;
  const bool is_fine = p.expanded_u && *p.expanded_u < 5.0 * kFinest;
  if (!p.value || !is_fine || p.flag == Flag::noise) return value_text(p);
  const double u = std::ceil(std::max(*p.expanded_u, kFinest) / kFinest - 1e-9) * kFinest;
  return fixed_text(*p.value, 2) + " ± " + fixed_text(u, 2);
}

const ScalarPoint* find(const Curves& curves, const std::string& method, const std::string& figure,
                        const std::string& state) {
  for (const ScalarPoint& p : curves.scalars) {
    if (p.method == method && p.figure == figure && p.state == state) return &p;
  }
  return nullptr;
}

Table noise_table(const ReportData& data) {
  static const Names kFigures{{"noise", "unweighted, 20 Hz to 20 kHz"},
                              {"noise-a", "A-weighted (IEC 61672-1)"},
                              {"noise-468", "quasi-peak (ITU-R BS.468-4)"},
                              {"hum-total", "hum, all lines found"},
                              {"mains-frequency", "mains frequency"}};
  Table t;
  t.caption =
      "Noise at the output, in two states: nothing sent, and with a low tone that keeps the unit "
      "at "
      "work, taken out of the reading. ± at 95 %.";
  t.heads = {"figure", "unit", "drive-free", "idle with bias"};
  for (const auto& [id, title] : kFigures) {
    const ScalarPoint* rest = find(data.curves, "silence", id, "drive-free");
    const ScalarPoint* idle = find(data.curves, "silence", id, "idle-with-bias");
    if (rest == nullptr && idle == nullptr) continue;
    t.rows.push_back({title, (rest != nullptr ? rest : idle)->value_unit,
                      rest != nullptr ? value_text(*rest) : kDash,
                      idle != nullptr ? value_text(*idle) : kDash});
  }
  return t;
}

Table hum_table(const ReportData& data) {
  Table t;
  t.caption = "Lines found at multiples of the mains frequency.";
  t.heads = {"state", "frequency, Hz", "level", "unit"};
  for (const ScalarPoint& p : data.curves.scalars) {
    if (p.method != "silence" || p.figure != "hum" || !p.frequency_hz) continue;
    t.rows.push_back({p.state, fixed_text(*p.frequency_hz, 2), value_text(p), p.value_unit});
  }
  return t;
}

Table multitone_table(const ReportData& data) {
  static const Names kFigures{{"noise-plus-distortion", "noise and distortion, dB"},
                              {"distortion", "distortion, dB"},
                              {"even-distortion", "even orders, dB"},
                              {"odd-distortion", "odd orders, dB"},
                              {"noise", "noise, dB"},
                              {"fill", "fill, %"}};
  Table t;
  t.heads = {"drive, " + drive_unit(data)};
  for (const auto& [ignored, title] : kFigures) t.heads.push_back(title);
  std::map<double, std::map<std::string, const ScalarPoint*>> rows;
  std::set<std::string> levels;
  for (const ScalarPoint& p : data.curves.scalars) {
    if (p.method != "multitone" || !p.drive) continue;
    rows[*p.drive][p.figure] = &p;
    if (p.figure == "fill") levels.insert(p.state);
  }
  for (const auto& [drive, figures] : rows) {
    std::vector<std::string> row{fixed_text(drive, 2)};
    for (const auto& [id, ignored] : kFigures) {
      const auto at = figures.find(id);
      row.push_back(at == figures.end() ? kDash : coarse_text(*at->second));
    }
    t.rows.push_back(std::move(row));
  }
  t.caption = fmt::format(
      "31 tones with the peak of the sine at each drive; dB relative to the tones' total. Fill: "
      "the "
      "share of bands of 1 ERB whose distortion the tones do not mask{}. ± at 95 %, \"<\" an upper "
      "limit.",
      levels.size() == 1 ? ", listened to at " + *levels.begin() : "");
  return t;
}

Table dynamic_table(const ReportData& data) {
  Table t;
  t.caption =
      "Square of 3.15 kHz with sine of 15 kHz, 4:1: root sum of squares of nine products over the "
      "sine. Through audio converters the square is band-limited and its edges are only so steep a "
      "share of the standard's; DIM is the name of an external generator's signal alone. ± at 95 "
      "%.";
  t.heads = {"signal",         "drive, " + drive_unit(data),
             "products, %",    "slope over DIM 30's",
             "over DIM 100's", "band limit, kHz"};
  for (const IntermodPoint& p : data.curves.intermods) {
    if (p.product != "square-sine") continue;
    const auto fact = [&](const char* figure, const char* state, double scale,
                          int digits) -> std::string {
      for (const ScalarPoint& s : data.curves.scalars) {
        if (s.method == p.method && s.figure == figure && s.state == state && s.drive == p.drive) {
          return s.value ? fixed_text(*s.value * scale, digits) : kDash;
        }
      }
      return kDash;
    };
    // To first order in a small uncertainty, u(r) / r = u in dB / 8.686.
    const Cell u = p.percent && p.expanded_u_db
                       ? Cell(*p.percent * *p.expanded_u_db * std::log(10.0) / 20.0)
                       : Cell();
    t.rows.push_back({"square and sine", fixed_text(p.drive, 2),
                      !p.percent              ? kDash
                      : p.flag == Flag::noise ? "< " + short_text(*p.percent, 3)
                                              : with_u(p.percent, u, 2),
                      fact("slope-fraction", "dim-30", 1.0, 2),
                      fact("slope-fraction", "dim-100", 1.0, 2), fact("band-limit", "-", 1e-3, 1)});
  }
  for (const auto& [method, title] : {std::pair("dim-30", "DIM 30, external generator"),
                                      std::pair("dim-100", "DIM 100, external generator")}) {
    const ScalarPoint* p = find(data.curves, method, "dim", "-");
    if (p != nullptr) t.rows.push_back({title, kDash, value_text(*p), kDash, kDash, kDash});
  }
  return t;
}

Table memory_table(const ReportData& data) {
  static const Names kFigures{{"gain-drift", "range of the gain of a reference tone over the run"},
                              {"ladder-loop-gain", "ladder down less up: gain"},
                              {"ladder-loop-h2", "ladder down less up: H2"},
                              {"ladder-loop-h3", "ladder down less up: H3"},
                              {"ladder-loop-h4", "ladder down less up: H4"},
                              {"ladder-loop-h5", "ladder down less up: H5"},
                              {"glide-loop-h1", "gliding level, down less up: gain"},
                              {"glide-loop-h2", "gliding level, down less up: H2"},
                              {"glide-loop-h3", "gliding level, down less up: H3"},
                              {"gain-change", "gain of a low tone right after a burst"},
                              {"recovery", "time until it is back"},
                              {"recovery-constant", "time constant of its return"},
                              {"blocking", "time for which it is more than 6 dB down"},
                              {"bias-shift", "shift of the bias by the burst"}};
  Table t;
  t.caption =
      "What changes with time rather than with drive. Loops and bursts at the drive where they are "
      "largest; ± at 95 %, \"<\": nothing beyond the uncertainty, at most so much.";
  t.heads = {"figure", "unit", "drive, " + drive_unit(data), "value"};
  for (const auto& [id, title] : kFigures) {
    // One row a figure: the largest that is more than an upper limit, else the largest limit.
    const ScalarPoint* shown = nullptr;
    for (const ScalarPoint& p : data.curves.scalars) {
      if (p.figure != id || !p.value) continue;
      const auto rank = [](const ScalarPoint& q) {
        return std::pair(q.flag != Flag::noise, std::abs(*q.value));
      };
      if (shown == nullptr || rank(p) > rank(*shown)) shown = &p;
    }
    if (shown == nullptr) continue;
    t.rows.push_back({title, shown->value_unit, shown->drive ? fixed_text(*shown->drive, 1) : kDash,
                      value_text(*shown)});
  }
  return t;
}

/// Products of each two-tone method at its highest drive, largest first.
Table products_table(const ReportData& data) {
  Table t;
  t.caption =
      "Products to order 5 at each method's highest drive; all drives, phases and levels stand in "
      "curves/products.csv. Relative to the method's reference: the upper tone, or both together.";
  t.heads = {"method", "product", "frequency, Hz", "relative, dB", "flag", "note"};
  std::map<std::string, double> highest;
  for (const ProductPoint& p : data.curves.products) {
    const auto [at, added] = highest.try_emplace(p.method, p.drive);
    if (!added) at->second = std::max(at->second, p.drive);
  }
  const auto term = [](int k, int index) {
    const std::string tone = fmt::format("f{}", index);
    if (k == 0) return std::string();
    return std::abs(k) == 1 ? tone : fmt::format("{}{}", std::abs(k), tone);
  };
  for (const ProductPoint& p : data.curves.products) {
    if (p.order < 2 || p.drive != highest[p.method]) continue;
    const std::string first = term(p.k1, 1), second = term(p.k2, 2);
    std::string product = p.k1 < 0 ? kMinus + first : first;
    if (p.k2 != 0)
      product += (p.k2 < 0 ? " " + std::string(kMinus) + " " : p.k1 != 0 ? " + " : "") + second;
    const bool limit = p.flag == Flag::noise;
    t.rows.push_back({p.method, product, fixed_text(p.frequency_hz, 1),
                      !p.relative_db ? kDash
                      : limit        ? "< " + fixed_text(*p.relative_db, 1)
                                     : with_u(p.relative_db, p.expanded_u_db, 2),
                      std::string(name(p.flag)), p.note == "-" ? "" : p.note});
  }
  return t;
}

Section section_of(const std::string& title, std::vector<Table> tables) {
  Section s;
  s.title = title;
  for (Table& t : tables) {
    if (!t.rows.empty()) s.blocks.emplace_back(std::move(t));
  }
  return s;
}

}  // namespace

Section noise_section(const ReportData& data) {
  return section_of("Noise and hum", {noise_table(data), hum_table(data)});
}

Section programme_section(const ReportData& data) {
  return section_of("Under programme-like drive", {multitone_table(data), dynamic_table(data)});
}

Section memory_section(const ReportData& data) {
  return section_of("Memory and drift", {memory_table(data)});
}

Section products_section(const ReportData& data) {
  Section s = section_of("Products of two tones", {products_table(data)});
  s.collapsed = s.on_screen_only = true;
  return s;
}

}  // namespace kneeprint
