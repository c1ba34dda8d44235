// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <string>

#include "picture/canvas.h"
#include "picture/palette.h"
#include "picture/value_scale.h"

namespace foreglow {

/// What stands under a map: the bar of colours with its ticks, the quantity and unit, and the flat colours'
/// legend.
struct ColourBar {
    Box bar;                ///< of the colours alone
    double font_size = 12;  ///< pixels per em
    std::string label;      ///< quantity and unit, under the ticks
    std::string whole;      ///< what shares in the legend are parts of: "sky" or "field"
};

/// Returns the height that bar, ticks, label and legend need, as far as the values call for them.
[[nodiscard]] double colour_bar_height(const ColourBar& bar, const ScaleChoice& choice);

/// Draws the bar, its ends pointed where values lie beyond the range, and a legend for undefined and not
/// positive pixels.
void draw_colour_bar(Canvas& canvas, const ColourBar& bar, const ScaleChoice& choice, const Palette& palette);

/// Writes a share for people: "4.2 %", "less than 0.1 %", never 0 % or 100 % unless it is exactly that.
[[nodiscard]] std::string format_share(double part, double whole);

}  // namespace foreglow
