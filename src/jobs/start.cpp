// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/start.h"

#include <system_error>

#include "base/error.h"
#include "io/atomic_file.h"
#include "io/text_file.h"

namespace foreglow {
namespace {

constexpr const char* start_study = R"toml(# A study: which sky, on which grid, seen through which channels.
#     foreglow plan THIS.toml     says what would be made, and what it costs
#     foreglow make THIS.toml     makes it
# Lines that begin with "# " and a key are optional keys; the value shown is the default or an example.
title  = "My array, first design"
model  = "disc-and-loops"            # a bundled model's name (foreglow models), or a path relative to this file;
                                     # this one is an INVENTED sky, from closed formulas
nside  = 64                          # the HEALPix grid: a power of two, 1 to 8192
stokes = "IQU"                       # "I" or "IQU"
unit   = "uK_CMB"                    # K_RJ, mK_RJ, uK_RJ, K_CMB, mK_CMB, uK_CMB, MJy/sr or Jy/pixel
seed   = 1                           # of everything random
# precision = "float32"              # of the files: float32 or float64
# frame = "galactic"                 # galactic, icrs or ecliptic
# ordering = "ring"                  # ring or nested
# polarization_convention = "COSMO"  # COSMO (HEALPix) or IAU: the sign of U
# monopole = "keep"                  # keep or remove
# coverage = "footprint.fits"        # only these pixels are written, as a partial-sky file
# pixel_window = false               # multiply by HEALPix's pixel window
# lmax = 128                         # default 2 nside; not trustworthy above about 2.5 nside
# accuracy = 1e-5                    # rms(error)/rms(map) of each map
# realizations = 1
# truth = true                       # false, true (amplitude, index and curvature maps) or "full"
# response_weights = "temperature"   # what a response weighs: temperature, radiance or photon
# reference_flux_index = 0.0         # of the calibration source of MJy/sr and Jy/pixel; -1 is usual in the infrared

[[channel]]
name      = "low"                    # the file's name: maps/low.fits
frequency = "30 GHz"
bandwidth = "6 GHz"                  # a flat response of this full width; without it one frequency
# response = "low.csv"               # instead of bandwidth: a table with the header frequency_GHz,transmission
beam_fwhm = "3 deg"                  # a Gaussian beam; without it no beam
# beam_window = "low_bl.csv"         # instead of beam_fwhm: a table with the header l,B_l or l,B_l,B_l_pol
# noise = "100 uK_CMB arcmin"        # used by `foreglow grade` only

[[channel]]
name      = "high"
frequency = "95 GHz"
bandwidth = "20 GHz"
beam_fwhm = "2.5 deg"

# Many regular channels, beside [[channel]] or instead of it; the files are grid_0000.fits and so on.
# [channel_grid]
# name  = "grid"
# first = "50 MHz"
# last  = "200 MHz"
# count = 16
# spacing = "linear"                 # linear or log
# bandwidth = "contiguous"           # or a width such as "0.5 MHz"
# beam_fwhm = "10 deg"               # at beam_at; scales as 1/frequency where beam_scaling = "diffraction"
# beam_at = "100 MHz"
# beam_scaling = "diffraction"       # diffraction or fixed
)toml";

/// Returns the map's path as the model file will need it: relative to the folder the model is written to.
std::filesystem::path path_from(const std::filesystem::path& map,
                                const std::optional<std::filesystem::path>& output) {
    if (!output || map.is_absolute() || output->parent_path().empty()) return map;
    std::error_code code;
    const auto relative = std::filesystem::relative(map, output->parent_path(), code);
    return code || relative.empty() ? std::filesystem::absolute(map) : relative;
}

void check_output(const std::filesystem::path& output) {
    std::error_code code;
    if (std::filesystem::exists(std::filesystem::symlink_status(output, code)))
        throw InputError(
            to_one_line("'" + output.string() + "' exists already: give another name or remove it"));
    if (output.has_parent_path() && !std::filesystem::is_directory(output.parent_path(), code))
        throw InputError(
            to_one_line("the folder '" + output.parent_path().string() + "' does not exist: make it first"));
}

}  // namespace

std::string make_start_study() {
    return start_study;
}

StartResult run_start(const StartRequest& request) {
    if (request.output) check_output(*request.output);
    StartResult result;
    if (request.model_for) {
        FitsMapRequest map;
        map.path = *request.model_for;
        const FitsMapHeader header = read_fits_map_header(map);
        result = make_start_model(header, path_from(*request.model_for, request.output));
    } else {
        result.text = make_start_study();
    }
    if (request.output) write_text_file(*request.output, result.text);
    return result;
}

}  // namespace foreglow
