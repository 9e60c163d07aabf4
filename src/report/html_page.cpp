// SPDX-License-Identifier: GPL-3.0-or-later
#include "report/html_page.h"

#include <fmt/format.h>

#include "figure/cairo_painter.h"
#include "figure/svg_text.h"

namespace kneeprint {
namespace {

constexpr const char* kStyle = R"(
@page { size: A4; margin: 16mm 15mm; }
:root { color-scheme: light; }
body { margin: 0; background: #fdfcf9; color: #22262b;
  font: 16px/1.5 "DejaVu Sans", "Segoe UI", "Helvetica Neue", Arial, sans-serif; }
main { max-width: 52rem; margin: 0 auto; padding: 2.5rem 1.25rem 4rem; }
header { border-bottom: 2px solid #22262b; margin-bottom: 1.5rem; padding-bottom: 0.8rem; }
h1 { font-size: 1.75rem; line-height: 1.2; margin: 0 0 0.4rem; overflow-wrap: anywhere; }
h2 { font-size: 1.2rem; line-height: 1.3; margin: 2.6rem 0 0.7rem; break-after: avoid; }
p { margin: 0.6rem 0; overflow-wrap: anywhere; }
.subtitle, figcaption, caption, .caption, footer {
  color: #5d646c; font-size: 0.85rem; overflow-wrap: anywhere; }
.notice { border: 1px solid #b8501f; border-left-width: 5px; background: #fff;
  padding: 0.55rem 0.9rem; margin: 0.6rem 0; break-inside: avoid; }
.notice p { margin: 0; font-size: 0.92rem; }
figure { margin: 1.4rem 0 2rem; break-inside: avoid; }
figure svg { display: block; height: auto; border: 1px solid #dedbd3; }
figcaption { margin-top: 0.5rem; }
.scroll { overflow-x: auto; margin: 0.9rem 0 1.3rem; }
table { border-collapse: collapse; font-size: 0.85rem; font-variant-numeric: tabular-nums; }
caption { text-align: left; padding-bottom: 0.4rem; }
th, td { padding: 0.25rem 0.7rem; text-align: right; vertical-align: top;
  border-bottom: 1px solid #dedbd3; }
th { font-weight: 600; border-bottom: 1.5px solid #22262b; vertical-align: bottom; }
.text, .all-text th, .all-text td { text-align: left; }
th:first-child, td:first-child { padding-left: 0; }
.plain td, .wide td { white-space: nowrap; }
tr { break-inside: avoid; }
dl { display: grid; grid-template-columns: minmax(8rem, 13rem) 1fr; gap: 0.3rem 1.2rem;
  font-size: 0.92rem; margin: 0.8rem 0; }
dt { color: #5d646c; overflow-wrap: anywhere; }
dd { margin: 0; overflow-wrap: anywhere; }
details { margin-top: 2.2rem; }
summary { font-size: 1.1rem; font-weight: 600; cursor: pointer; }
footer { margin-top: 3rem; border-top: 1px solid #dedbd3; padding-top: 0.6rem; }
@media (max-width: 36rem) {
  dl { grid-template-columns: 1fr; gap: 0 0; }
  dd { margin-bottom: 0.6rem; } }
@media print { body { font-size: 10pt; background: #fff; } main { max-width: none; padding: 0; }
  figure { margin: 0.6rem 0 0.9rem; } figure svg { max-height: 98mm; }
  .scroll { overflow: visible; }
  table { font-size: 7.5pt; } .wide { font-size: 6.5pt; }
  .wide th, .wide td { padding: 0.15rem 0.25rem; } }
)";

/// A table of more columns than this scrolls, and its cells stay on one line.
constexpr std::size_t kWide = 8;

class HtmlSetter {
 public:
  void operator()(const Paragraph& p) { out_ += fmt::format("<p>{}</p>\n", escape_markup(p.text)); }

  void operator()(const Notice& n) {
    out_ += fmt::format("<div class=\"notice\" role=\"note\"><p><strong>{}</strong> {}</p></div>\n",
                        escape_markup(n.title), escape_markup(n.text));
  }

  void operator()(const Definitions& d) {
    out_ += "<dl>\n";
    for (const auto& [term, text] : d.entries)
      out_ += fmt::format("<dt>{}</dt><dd>{}</dd>\n", escape_markup(term), escape_markup(text));
    out_ += "</dl>\n";
  }

  void operator()(const Table& t) {
    const bool wide = t.heads.size() > kWide;
    const char* kind = t.all_text ? "all-text" : wide ? "wide" : "plain";
    // The caption of a table that scrolls must not scroll away with it.
    if (wide && !t.caption.empty())
      out_ += fmt::format("<p class=\"caption\">{}</p>\n", escape_markup(t.caption));
    out_ += fmt::format("<div class=\"scroll\"><table class=\"{}\">\n", kind);
    if (!wide && !t.caption.empty())
      out_ += fmt::format("<caption>{}</caption>\n", escape_markup(t.caption));
    out_ += "<thead><tr>";
    for (std::size_t i = 0; i < t.heads.size(); ++i)
      cell(t, i, "th scope=\"col\"", "th", t.heads[i]);
    out_ += "</tr></thead>\n<tbody>\n";
    for (const auto& row : t.rows) {
      out_ += "<tr>";
      for (std::size_t i = 0; i < row.size(); ++i) cell(t, i, "td", "td", row[i]);
      out_ += "</tr>\n";
    }
    out_ += "</tbody></table></div>\n";
  }

  void operator()(const Figure& f) {
    out_ += fmt::format("<figure>\n{}<figcaption>{}</figcaption>\n</figure>\n", svg(f),
                        escape_markup(f.caption));
  }

  void section(const Section& s) {
    if (s.blocks.empty()) return;
    if (s.collapsed)
      out_ += fmt::format("<details>\n<summary>{}</summary>\n", escape_markup(s.title));
    else
      out_ += "<section>\n";
    if (!s.collapsed && !s.title.empty())
      out_ += fmt::format("<h2>{}</h2>\n", escape_markup(s.title));
    for (const auto& block : s.blocks) std::visit(*this, block);
    out_ += s.collapsed ? "</details>\n" : "</section>\n";
  }

  std::string take() { return std::move(out_); }

 private:
  void cell(const Table& t, std::size_t column, const char* open, const char* close,
            const std::string& text) {
    const bool left = column == 0 && t.first_column_is_text;
    out_ += fmt::format("<{}{}>{}</{}>", open, left ? " class=\"text\"" : "", escape_markup(text),
                        close);
  }

  std::string out_;
};

}  // namespace

std::string html_page(const Page& page) {
  HtmlSetter set;
  for (const auto& s : page.sections) set.section(s);
  return fmt::format(
      "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\"/>\n<meta "
      "name=\"viewport\" content=\"width=device-width, "
      "initial-scale=1\"/>\n<title>{0}</title>\n<style>{1}</style>\n</"
      "head>\n<body>\n<main>\n<header>\n<h1>{0}</h1>\n<p "
      "class=\"subtitle\">{2}</p>\n</header>\n{3}<footer>{4}</footer>\n</main>\n</body>\n</html>\n",
      escape_markup(page.title), kStyle, escape_markup(page.subtitle), set.take(),
      escape_markup(page.footer));
}

}  // namespace kneeprint
