// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "base/quantity.h"
#include "picture/palette.h"
#include "picture/value_scale.h"
#include "sphere/sky_map.h"

namespace foreglow {

/// The bytes of a PNG file, its size, and sentences that the user should read (values that could not be shown
/// and the like).
struct Picture {
    std::string png;
    int width = 0, height = 0;
    std::vector<std::string> notices;
};

/// How a map is to look.
struct PictureOptions {
    static constexpr int least_width = 300, largest_width = 8000;

    std::string title;     ///< above the map; none where empty
    std::string quantity;  ///< "Brightness temperature", put before the unit at the colour bar; may be empty
    std::string unit;      ///< "uK_CMB"; the map's own unit where empty
    ScaleRequest scale;
    std::optional<PaletteKind> palette;  ///< diverging for signed scales and sequential for others where open
    int width = 1200;                    ///< of the whole picture in pixels
    bool few_colours = false;  ///< a table of 256 colours instead of all: small and quick, for pages
};

/// The square of the sky that a close-up shows, in the map's frame.
struct CloseUpField {
    static constexpr double largest_size_deg = 120;

    Angle longitude, latitude;
    Angle size;  ///< across its middle
};

/// Draws the whole sky: Mollweide projection, centre (0, 0) of the map's frame, longitude grows to the left,
/// graticule every 30 deg in latitude and 60 deg in longitude, colour bar with unit, undefined pixels in a
/// grey named in the legend.
/// @throws InputError where the width or the scale asked for cannot be; FileError where the font is missing
[[nodiscard]] Picture draw_all_sky(const SkyMap& map, const PictureOptions& options);

/// Draws the whole sky as draw_all_sky does, many times: letters, palettes and the geometry of the last grid
/// and size are made once. For one thread.
class AllSkyPainter {
  public:
    AllSkyPainter();
    ~AllSkyPainter();
    AllSkyPainter(AllSkyPainter&&) noexcept;
    AllSkyPainter& operator=(AllSkyPainter&&) noexcept;

    /// @throws as draw_all_sky
    [[nodiscard]] Picture draw(const SkyMap& map, const PictureOptions& options);

  private:
    friend Picture draw_all_sky(const SkyMap& map, const PictureOptions& options);
    struct Implementation;
    std::unique_ptr<Implementation> implementation_;
};

/// Draws a square of the sky, gnomonic projection, north up and longitude growing to the left; the scale is
/// chosen from what is seen.
/// @throws InputError where width, size or scale cannot be; FileError where the font is missing
[[nodiscard]] Picture draw_close_up(const SkyMap& map, const CloseUpField& field,
                                    const PictureOptions& options);

}  // namespace foreglow
