// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cmath>
#include <string>
#include <vector>

#include "picture/colour.h"

namespace foreglow {

/// The ways of turning a number from 0 to 1 into a colour.
///
/// All are computed in Oklab (lightness L, chroma C, hue h), so that equal steps look equal and lightness
/// alone, which every kind of colour vision sees, orders the values.
/// - Sequential: L = 0.20 + 0.76 t, h = 215 + 210 t [deg], C = 0.125 sin(pi t) + 0.02; deep teal, blue,
///   mauve, rose, cream.
/// - Diverging, with s = 2 t - 1: L = 0.96 - 0.60 |s|, C = 0.125 sin(3 pi |s|/4), h = 250 where s < 0 and 50
///   where s > 0; blue, near-white, rust.
/// - Grey: L = 0.12 + 0.85 t, C = 0.
/// All of these colours exist on a screen, so that none is clipped.
enum class PaletteKind { Sequential, Diverging, Grey };

/// Reads "sequential", "diverging" or "grey".
/// @throws InputError otherwise
[[nodiscard]] PaletteKind parse_palette(const std::string& text);

/// A palette tabulated in 1024 steps.
class Palette {
  public:
    explicit Palette(PaletteKind kind);
    /// @param position  0 to 1; anything beyond takes the end's colour
    [[nodiscard]] Rgb at(double position) const {
        const double clamped = position < 0 ? 0.0 : position < 1 ? position : 1.0;
        return colours_[static_cast<std::size_t>(std::lround(clamped * (steps - 1)))];
    }

  private:
    static constexpr int steps = 1024;
    std::vector<Rgb> colours_;
};

/// The flat colours of pixels that have no place in a palette.
inline constexpr Rgb undefined_colour{150, 150, 150};
inline constexpr Rgb not_positive_colour{96, 140, 130};

}  // namespace foreglow
