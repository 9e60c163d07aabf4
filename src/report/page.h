// SPDX-License-Identifier: GPL-3.0-or-later
// A page described once, set twice: as HTML and as a PDF. Plain text throughout; setters escape it.
#pragma once

#include <string>
#include <variant>
#include <vector>

#include "figure/figure.h"

namespace kneeprint {

struct Paragraph {
  std::string text;
};

/// What a reader must know before trusting a figure of the page.
struct Notice {
  std::string title, text;
};

struct Table {
  std::string caption;
  std::vector<std::string> heads;
  std::vector<std::vector<std::string>> rows;  ///< as wide as heads
  bool first_column_is_text = true;            ///< the others are numbers: right-aligned
  bool all_text = false;
};

/// Term and explanation; also used for facts ("source impedance", "50 ohm").
struct Definitions {
  std::vector<std::pair<std::string, std::string>> entries;
};

using Block = std::variant<Paragraph, Notice, Table, Definitions, Figure>;

struct Section {
  std::string title;  ///< empty: none is set
  std::vector<Block> blocks;
  bool collapsed = false;       ///< HTML: behind its title until opened
  bool on_screen_only = false;  ///< too long for paper
};

struct Page {
  std::string title, subtitle;
  std::string created;  ///< UTC, ISO 8601: the start of the measurement, so that pages repeat
  std::vector<Section> sections;
  std::string footer;
};

}  // namespace kneeprint
