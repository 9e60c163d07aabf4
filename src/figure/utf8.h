// SPDX-License-Identifier: GPL-3.0-or-later
// UTF-8 text as far as drawing it needs: letters, words, and text that cannot upset a painter.
#pragma once

#include <string>
#include <string_view>
#include <vector>

namespace kneeprint {

/// Valid UTF-8 without control characters: a tab, line break or the like becomes a space, every
/// byte that is not part of a valid sequence (RFC 3629) becomes U+FFFD.
std::string printable_utf8(std::string_view text);

/// One string per code point. Expects valid UTF-8.
std::vector<std::string> split_letters(std::string_view text);

/// Parts between spaces and line breaks; none is empty.
std::vector<std::string> split_words(std::string_view text);

}  // namespace kneeprint
