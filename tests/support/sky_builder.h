// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cmath>
#include <filesystem>
#include <functional>
#include <memory>
#include <string>
#include <vector>

#include "model/channel.h"
#include "model/sky_model.h"
#include "sphere/harmonics.h"
#include "support/fits_builder.h"

namespace foreglow::testing {

using SkyFunction = std::function<double(const Vector3&)>;

/// Samples a function of direction at the pixels' centres.
[[nodiscard]] inline std::vector<double> sample(const HealpixGrid& grid, const SkyFunction& function) {
    std::vector<double> values;
    for (std::int64_t p = 0; p < grid.npix(); ++p)
        values.push_back(function(grid.direction(p)));
    return values;
}

[[nodiscard]] inline std::shared_ptr<SkyMap> make_map(const HealpixGrid& grid, const SkyFunction& function,
                                                      Frame frame = Frame::Galactic) {
    return std::make_shared<SkyMap>(SkyMap{grid, frame, "", sample(grid, function)});
}

// An invented sky with a bright plane that no lmax holds, and spectra that vary over it.
[[nodiscard]] inline double test_brightness(const Vector3& n) {
    return 8 / (std::abs(n[2]) + 0.1) + 3 * std::exp(2 * n[0] + n[1]);
}
[[nodiscard]] inline double test_index(const Vector3& n) {
    return -2.8 + 0.2 * n[0] * n[1] + 0.15 * std::sin(5 * n[2]);
}
[[nodiscard]] inline double test_curvature(const Vector3& n) {
    return -0.04 + 0.03 * n[2];
}
[[nodiscard]] inline double test_q(const Vector3& n) {
    return (1 - n[2] * n[2]) * (2 * std::cos(3 * n[0]) + 0.5);
}
[[nodiscard]] inline double test_u(const Vector3& n) {
    return (1 - n[2] * n[2]) * std::sin(2 * n[1] + n[2]);
}

/// Makes that sky, each part a map on the grid, at 408 MHz.
[[nodiscard]] inline SkyModel make_test_sky(int nside, bool polarized) {
    SkyModel sky;
    sky.grid = HealpixGrid(nside);
    sky.reference = Frequency::from_hz(408e6);
    sky.intensity = PixelField::of_map(make_map(sky.grid, test_brightness));
    sky.index = PixelField::of_map(make_map(sky.grid, test_index));
    sky.curvature = PixelField::of_map(make_map(sky.grid, test_curvature));
    if (!polarized) return sky;
    PolarizedSky part;
    part.stokes.source = std::make_shared<const StokesMaps>(
        StokesMaps{sky.grid, sky.frame, "K_RJ", sample(sky.grid, test_q), sample(sky.grid, test_u)});
    part.reference = sky.reference;
    sky.polarization = std::move(part);
    return sky;
}

/// The strip that is the whole sky: its buffer is the map.
[[nodiscard]] inline RingStrip whole_sky(const HealpixGrid& grid) {
    return {0, grid.ring_count(), false};
}

[[nodiscard]] inline ChannelSpec channel_spec(const std::string& name, double ghz, double width_ghz = 0,
                                              double fwhm_deg = 0) {
    ChannelSpec spec;
    spec.name = name;
    spec.place = "study.toml:1:1";
    spec.frequency = Frequency::from_ghz(ghz);
    if (width_ghz > 0) spec.bandwidth = Frequency::from_ghz(width_ghz);
    if (fwhm_deg > 0) spec.beam_fwhm = Angle::from_degrees(fwhm_deg);
    return spec;
}

/// A study of these channels in uK_CMB, lmax = 2 nside.
[[nodiscard]] inline StudySpec study_spec(int nside, std::vector<ChannelSpec> channels,
                                          bool polarized = false) {
    StudySpec study;
    study.nside = nside;
    study.lmax = 2 * nside;
    study.polarized = polarized;
    study.unit = *find_brightness_unit("uK_CMB");
    study.channels = std::move(channels);
    return study;
}

/// A FITS map in RING order, galactic, of double columns all in one unit ("" writes no TUNIT).
[[nodiscard]] inline FitsMapBuilder fits_map(int nside, const std::vector<std::vector<double>>& columns,
                                             const std::string& unit = "") {
    FitsMapBuilder builder(nside);
    for (std::size_t c = 0; c < columns.size(); ++c)
        builder.column(std::string(1, static_cast<char>('A' + c)), "1D", columns[c], unit);
    return builder;
}

/// rms of the differences relative to the rms of the second, where both are defined.
[[nodiscard]] inline double relative_rms(const std::vector<double>& a, const std::vector<double>& b) {
    double error = 0, size = 0;
    for (std::size_t i = 0; i < a.size(); ++i) {
        if (!is_defined(a[i]) || !is_defined(b[i])) continue;
        error += (a[i] - b[i]) * (a[i] - b[i]);
        size += b[i] * b[i];
    }
    return std::sqrt(error / size);
}

[[nodiscard]] inline std::int64_t undefined_count(const std::vector<double>& values) {
    std::int64_t count = 0;
    for (const double value : values)
        count += is_defined(value) ? 0 : 1;
    return count;
}

/// Tells whether two maps are the same bit for bit, undefined pixels included.
[[nodiscard]] inline bool same_bits(const std::vector<double>& a, const std::vector<double>& b) {
    if (a.size() != b.size()) return false;
    for (std::size_t i = 0; i < a.size(); ++i)
        if (is_defined(a[i]) != is_defined(b[i]) ||
            (is_defined(a[i]) && std::bit_cast<std::uint64_t>(a[i]) != std::bit_cast<std::uint64_t>(b[i])))
            return false;
    return true;
}

}  // namespace foreglow::testing
