// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <string>
#include <variant>

namespace foreglow {

/// One card of a FITS header: KEYWORD = value / comment.
struct FitsCard {
    std::string key;  ///< up to eight of A-Z, 0-9, '-' and '_'
    std::variant<std::string, double, std::int64_t, bool> value;
    std::string comment;
};

}  // namespace foreglow
