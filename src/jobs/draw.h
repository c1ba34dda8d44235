// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "base/quantity.h"
#include "sphere/frame.h"
#include "sphere/grid.h"

namespace foreglow {

/// What `foreglow draw MAP.fits` is asked for; what is left open is chosen from the map.
struct DrawOptions {
    std::filesystem::path map;
    std::optional<std::string> column;  ///< number from 1, or name; the first where open
    std::optional<int> hdu;             ///< as read_fits_map
    std::optional<Ordering> ordering;   ///< where the file does not say
    std::optional<Frame> frame;         ///< where the file does not say
    std::optional<std::filesystem::path>
        output;                        ///< ends in .png; else MAP's stem, "-COLUMN" if asked for, ".png"
    std::optional<std::string> title;  ///< else the file's name, column and frequency
    std::optional<std::string> unit;   ///< names the unit the file leaves open, or rescales: K_RJ to uK_RJ
    std::optional<std::array<double, 2>>
        center;                          ///< longitude and latitude [deg] of a close-up, in the map's frame
    std::optional<Angle> size;           ///< of a close-up, up to 120 deg
    std::optional<std::string> scale;    ///< linear, log or signed
    std::optional<double> low, high;     ///< ends of the range, in the unit shown
    std::optional<std::string> palette;  ///< sequential, diverging or grey
    int width = 1200;                    ///< pixels, 300 to 8000
    bool replace = false;                ///< an existing picture may be replaced
};

struct DrawResult {
    std::filesystem::path picture;     ///< the file written
    int width = 0, height = 0;         ///< pixels
    std::vector<std::string> notices;  ///< one line each, to be shown to the user
};

/// Draws one column of a HEALPix FITS map as a PNG file: the whole sky, or a close-up where center and size
/// are given.
/// @throws InputError where the picture exists already, an option is wrong or contradicts another, the map or
/// column is not there, or the map's frame or ordering is left open; DataError and FileError as read_fits_map
[[nodiscard]] DrawResult run_draw(const DrawOptions& options);

}  // namespace foreglow
