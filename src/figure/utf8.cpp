// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/utf8.h"

#include <cstdint>

namespace kneeprint {
namespace {

unsigned byte(char c) { return static_cast<unsigned char>(c); }

/// Length of the valid sequence at the start of `s`, 0 when there is none.
std::size_t sequence_length(std::string_view s) {
  const unsigned first = byte(s[0]);
  if (first < 0x80) return 1;
  const std::size_t n = first >= 0xf0 ? 4 : first >= 0xe0 ? 3 : 2;
  if (first < 0xc2 || first > 0xf4 || s.size() < n) return 0;
  std::uint32_t code = first & (0x7f >> n);
  for (std::size_t i = 1; i < n; ++i) {
    if ((byte(s[i]) & 0xc0) != 0x80) return 0;
    code = code << 6 | (byte(s[i]) & 0x3f);
  }
  const bool overlong = (n == 3 && code < 0x800) || (n == 4 && code < 0x10000);
  const bool surrogate = code >= 0xd800 && code <= 0xdfff;
  return overlong || surrogate || code > 0x10ffff ? 0 : n;
}

}  // namespace

std::string printable_utf8(std::string_view text) {
  std::string out;
  while (!text.empty()) {
    const std::size_t n = sequence_length(text);
    const bool control = n == 1 && (byte(text[0]) < 0x20 || byte(text[0]) == 0x7f);
    const bool late_control = n == 2 && byte(text[0]) == 0xc2 && byte(text[1]) < 0xa0;
    if (n == 0) {
      out += "\uFFFD";
    } else if (control || late_control) {
      out += ' ';
    } else {
      out += text.substr(0, n);
    }
    text.remove_prefix(n == 0 ? 1 : n);
  }
  return out;
}

std::vector<std::string> split_letters(std::string_view text) {
  std::vector<std::string> letters;
  for (char c : text) {
    if ((byte(c) & 0xc0) != 0x80 || letters.empty()) letters.emplace_back();
    letters.back() += c;
  }
  return letters;
}

std::vector<std::string> split_words(std::string_view text) {
  std::vector<std::string> words;
  bool inside = false;
  for (char c : text) {
    const bool gap = c == ' ' || c == '\n' || c == '\t' || c == '\r';
    if (!gap && !inside) words.emplace_back();
    if (!gap) words.back() += c;
    inside = !gap;
  }
  return words;
}

}  // namespace kneeprint
