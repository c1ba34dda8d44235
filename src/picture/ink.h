// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <algorithm>

#include "picture/colour.h"

namespace foreglow {

inline constexpr Rgb paper{255, 255, 255};
inline constexpr Rgb ink{28, 30, 38};
inline constexpr Rgb faint_ink{92, 96, 108};

/// Returns the width of the thinnest line that goes with letters of a size.
[[nodiscard]] inline double hairline(double font_size) {
    return std::max(1.0, font_size / 16);
}

}  // namespace foreglow
