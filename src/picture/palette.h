// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <string>
#include <vector>

#include "picture/colour.h"

namespace foreglow {

/// The ways of turning a number from 0 to 1 into a colour.
///
/// All are computed in Oklab (lightness L, chroma C, hue h), so that equal steps look equal and lightness
/// alone, which every kind of colour vision sees, orders the values.
/// - Sequential: L = 0.17 + 0.80 t, h = 200 + 225 t [deg], C = 0.13 sin(pi t)^0.8 + 0.025; deep teal, blue,
///   mauve, rose, cream.
/// - Diverging, with s = 2 t - 1: L = 0.96 - 0.60 |s|, C = 0.15 sin(pi |s|/2)^0.9, h = 250 where s < 0 and 50
///   where s > 0; blue, near-white, rust.
/// - Grey: L = 0.12 + 0.85 t, C = 0.
enum class PaletteKind { Sequential, Diverging, Grey };

/// Reads "sequential", "diverging" or "grey".
/// @throws InputError otherwise
[[nodiscard]] PaletteKind parse_palette(const std::string& text);

/// A palette tabulated in 1024 steps.
class Palette {
  public:
    explicit Palette(PaletteKind kind);
    /// @param position  0 to 1; anything beyond takes the end's colour
    [[nodiscard]] Rgb at(double position) const;

  private:
    std::vector<Rgb> colours_;
};

/// The flat colours of pixels that have no place in a palette.
inline constexpr Rgb undefined_colour{150, 150, 150};
inline constexpr Rgb not_positive_colour{96, 140, 130};

}  // namespace foreglow
