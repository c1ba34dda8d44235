// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <initializer_list>
#include <string>
#include <string_view>

namespace foreglow {

/// Returns text as it must stand in HTML and SVG, in elements and in quoted attributes: & < > " ' become
/// entities, control characters that XML does not allow become U+FFFD.
[[nodiscard]] std::string escape_markup(std::string_view text);

/// Returns pieces of text, one behind the other.
[[nodiscard]] std::string join(std::initializer_list<std::string_view> pieces);

/// Returns bytes in base64 with padding (RFC 4648, section 4).
[[nodiscard]] std::string encode_base64(std::string_view bytes);

}  // namespace foreglow
