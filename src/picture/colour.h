// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>

namespace foreglow {

/// A colour as a screen has it: 8-bit sRGB.
struct Rgb {
    std::uint8_t red = 0, green = 0, blue = 0;
    bool operator==(const Rgb&) const = default;
};

/// A colour by lightness (0 black, 1 white), chroma (0 grey; the most vivid ones near 0.3) and hue [deg] in
/// Oklab.
struct OklabColour {
    double lightness = 0, chroma = 0, hue_deg = 0;
};

/// Converts to sRGB with the matrices of Oklab (Ottosson 2020, "A perceptual color space for image
/// processing") and the transfer curve of IEC 61966-2-1; a colour that no screen has keeps lightness and hue
/// and loses chroma until it fits.
[[nodiscard]] Rgb to_rgb(const OklabColour& colour);

/// Returns the Oklab lightness of a screen colour, 0 to 1.
[[nodiscard]] double oklab_lightness(Rgb colour);

/// Mixes two colours: share 0 gives a, 1 gives b, in between by linear 8-bit interpolation.
[[nodiscard]] Rgb mix(Rgb a, Rgb b, double share);

}  // namespace foreglow
