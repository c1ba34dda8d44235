// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <vector>

#include "picture/colour.h"
#include "picture/palette.h"

namespace foreglow {

/// 256 colours for a picture of a map: levels of its palette, those under the lines of the axes, the greys of
/// letters and the flat colours.
class ColourTable {
  public:
    explicit ColourTable(const Palette& palette);

    [[nodiscard]] const std::vector<Rgb>& colours() const { return colours_; }
    /// Returns the number of the colour that is nearest (in red, green and blue) to the middle of the cell of
    /// 4 x 4 x 4 colours that holds one; a colour of the table itself is met to 4 of 255 steps. Not for two
    /// threads at once.
    [[nodiscard]] std::uint8_t nearest(Rgb colour) {
        std::int16_t& known = known_[cell(colour)];
        if (known < 0) known = search(colour);
        return static_cast<std::uint8_t>(known);
    }

  private:
    [[nodiscard]] static std::size_t cell(Rgb c) {
        return (static_cast<std::size_t>(c.red >> 2U) << 12U) |
               (static_cast<std::size_t>(c.green >> 2U) << 6U) | static_cast<std::size_t>(c.blue >> 2U);
    }
    [[nodiscard]] std::int16_t search(Rgb colour) const;

    std::vector<Rgb> colours_;
    std::vector<std::int16_t> known_;  ///< for each cell the answer, or -1
};

}  // namespace foreglow
