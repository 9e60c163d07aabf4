// SPDX-License-Identifier: GPL-3.0-or-later
// A small check of XML well-formedness, independent of what writes the pages.
#pragma once

#include <cctype>
#include <set>
#include <string>
#include <vector>

namespace kneeprint {

/// "" when every tag is closed in order, every attribute is quoted and given once, every '&' begins
/// a reference and no '<' stands in text; else what is wrong and where.
inline std::string markup_fault(const std::string& text) {
  std::vector<std::string> open;
  const auto near = [&](std::size_t at) { return " near: " + text.substr(at, 60); };
  for (std::size_t i = 0; i < text.size();) {
    if (text[i] == '&') {
      const std::size_t end = text.find(';', i);
      if (end == std::string::npos || end - i > 8) return "bare ampersand" + near(i);
      i = end + 1;
      continue;
    }
    if (text[i] != '<') {
      if (!std::isspace(static_cast<unsigned char>(text[i])) && open.empty())
        return "text outside the root" + near(i);
      ++i;
      continue;
    }
    if (text.compare(i, 2, "<!") == 0 || text.compare(i, 2, "<?") == 0) {
      i = text.find('>', i);
      if (i++ == std::string::npos) return "unclosed declaration";
      continue;
    }
    const std::size_t start = i++;
    const bool closing = i < text.size() && text[i] == '/';
    if (closing) ++i;
    std::string name;
    while (i < text.size() && (std::isalnum(static_cast<unsigned char>(text[i])) || text[i] == '-'))
      name += text[i++];
    if (name.empty()) return "no tag name" + near(start);
    std::set<std::string> seen;
    bool empty = false;
    for (;;) {
      while (i < text.size() && std::isspace(static_cast<unsigned char>(text[i]))) ++i;
      if (i >= text.size()) return "unclosed tag" + near(start);
      if (text[i] == '>') break;
      if (text[i] == '/') {
        empty = true;
        ++i;
        continue;
      }
      std::string attribute;
      while (i < text.size() && text[i] != '=' && text[i] != '>' && text[i] != ' ')
        attribute += text[i++];
      if (i + 1 >= text.size() || text[i] != '=' || text[i + 1] != '"')
        return "attribute without a quoted value" + near(start);
      const std::size_t end = text.find('"', i + 2);
      if (end == std::string::npos) return "unclosed attribute" + near(start);
      if (text.substr(i, end - i).find('<') != std::string::npos)
        return "tag inside an attribute" + near(start);
      if (!seen.insert(attribute).second) return "attribute given twice" + near(start);
      i = end + 1;
    }
    ++i;
    if (closing) {
      if (open.empty() || open.back() != name) return "closed out of order" + near(start);
      open.pop_back();
    } else if (!empty) {
      open.push_back(name);
    }
  }
  return open.empty() ? "" : "never closed: " + open.back();
}

inline std::size_t count_of(const std::string& text, const std::string& part) {
  std::size_t n = 0;
  for (std::size_t at = text.find(part); at != std::string::npos; at = text.find(part, at + 1)) ++n;
  return n;
}

/// Values of every id="...".
inline std::vector<std::string> ids_of(const std::string& text) {
  std::vector<std::string> ids;
  const std::string key = " id=\"";
  for (std::size_t at = text.find(key); at != std::string::npos; at = text.find(key, at + 1))
    ids.push_back(text.substr(at + key.size(), text.find('"', at + key.size()) - at - key.size()));
  return ids;
}

}  // namespace kneeprint
