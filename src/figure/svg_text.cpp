// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/svg_text.h"

#include <fmt/format.h>

#include <cctype>
#include <map>

#include "figure/utf8.h"
#include "quantity/failure.h"

namespace kneeprint {
namespace {

/// `text` with what stands between `before` and `after` replaced by `change` of it.
template <class Change>
std::string replace_between(const std::string& text, std::string_view before, char after,
                            const Change& change) {
  std::string out;
  std::size_t from = 0;
  for (;;) {
    const std::size_t found = text.find(before, from);
    if (found == std::string::npos) return out + text.substr(from);
    const std::size_t start = found + before.size();
    const std::size_t end = text.find(after, start);
    out += text.substr(from, start - from) + change(text.substr(start, end - start));
    from = end;
  }
}

std::string safe_id(const std::string& id) {
  std::string out;
  for (char c : id) out += std::isalnum(static_cast<unsigned char>(c)) ? c : '-';
  return out.empty() || !std::isalpha(static_cast<unsigned char>(out[0])) ? "f" + out : out;
}

}  // namespace

std::string escape_markup(std::string_view text) {
  std::string out;
  for (char c : printable_utf8(text)) {
    switch (c) {
      case '&':
        out += "&amp;";
        break;
      case '<':
        out += "&lt;";
        break;
      case '>':
        out += "&gt;";
        break;
      case '"':
        out += "&quot;";
        break;
      case '\'':
        out += "&#39;";
        break;
      default:
        out += c;
    }
  }
  return out;
}

std::string embeddable_svg(const std::string& cairo_text, const std::string& id,
                           const std::string& title, double width, double height) {
  const std::size_t root = cairo_text.find("<svg");
  const std::size_t inside = root == std::string::npos ? root : cairo_text.find('>', root);
  if (inside == std::string::npos)
    throw Failure(ExitCode::bad_input, "the figure '" + id + "' could not be drawn as SVG");
  std::string body = cairo_text.substr(inside + 1);

  std::map<std::string, std::string> names;
  const std::string prefix = safe_id(id) + "-";
  const auto renamed = [&](const std::string& old) {
    return names.try_emplace(old, prefix + std::to_string(names.size() + 1)).first->second;
  };
  body = replace_between(body, " id=\"", '"', renamed);
  body = replace_between(body, "url(#", ')', renamed);
  body = replace_between(body, "xlink:href=\"#", '"', renamed);
  for (std::size_t at; (at = body.find("xlink:href")) != std::string::npos;)
    body.replace(at, 10, "href");

  return fmt::format(
      "<svg xmlns=\"http://www.w3.org/2000/svg\" role=\"img\" aria-label=\"{0}\" "
      "viewBox=\"0 0 {1:g} {2:g}\" width=\"100%\">\n<title>{0}</title>{3}",
      escape_markup(title), width, height, body);
}

}  // namespace kneeprint
