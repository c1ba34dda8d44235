// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <string>

#include "picture/canvas.h"
#include "picture/sky_picture.h"

namespace foreglow {

/// Names of a frame's coordinates, as axis labels have them.
struct CoordinateNames {
    std::string system, longitude, latitude;
};
[[nodiscard]] CoordinateNames coordinate_names(Frame frame);

/// Draws meridians every 60 deg and parallels every 30 deg over the ellipse in `bounds`, with their labels.
void draw_ellipse_graticule(Canvas& canvas, const Box& bounds, double font_size);

/// Tells whether a field holds a pole or nearly so; its rim is then labelled with longitudes all round.
[[nodiscard]] bool has_pole(const CloseUpField& field);

/// Draws the lines of equal coordinates over a close-up in `bounds`, with labels: longitudes below and
/// latitudes left, or longitudes all round and latitudes on the rings where there is a pole.
void draw_field_graticule(Canvas& canvas, const Box& bounds, const CloseUpField& field, double font_size);

}  // namespace foreglow
