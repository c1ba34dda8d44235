// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/resources.h"

#include <algorithm>
#include <fstream>
#include <limits>
#include <string>

#include "jobs/plan.h"

namespace foreglow {
namespace {

constexpr double program_bytes = 60e6;   // libraries and buffers, measured on an empty study
constexpr double strip_pixels = 4.2e6;   // of the strips in which maps are made
constexpr double usual_components = 10;  // K for accuracies near 1e-5
// Measured on two cores (docs/performance.md): one spin-0 transform takes 1.1e-9 s nside lmax^2, spin 2
// takes 3.3 times that; a law in a pixel takes 4 ns; a file is written at 1.5 GB/s.
constexpr double seconds_per_transform = 1.1e-9;
constexpr double spin2_factor = 3.3;
constexpr double seconds_per_pixel = 4e-9;
constexpr double bytes_per_second = 1.5e9;

std::filesystem::path existing_part(std::filesystem::path folder) {
    std::error_code code;
    folder = std::filesystem::absolute(folder, code);
    while (!folder.empty() && !std::filesystem::exists(folder, code) && folder.has_parent_path() &&
           folder.parent_path() != folder)
        folder = folder.parent_path();
    return folder;
}

}  // namespace

Resources available_resources(const std::filesystem::path& folder) {
    Resources resources{std::numeric_limits<std::int64_t>::max(), std::numeric_limits<std::int64_t>::max()};
    std::ifstream meminfo("/proc/meminfo");
    std::string key, unit;
    std::int64_t kibibytes = 0;
    while (meminfo >> key >> kibibytes >> unit)
        if (key == "MemAvailable:") resources.memory_bytes = kibibytes * 1024;
    std::error_code code;
    const auto space = std::filesystem::space(existing_part(folder), code);
    if (!code)
        resources.disk_bytes = static_cast<std::int64_t>(
            std::min<std::uintmax_t>(space.available, std::numeric_limits<std::int64_t>::max()));
    return resources;
}

void estimate_costs(Plan& plan) {
    const StudySpec& study = plan.study;
    const auto npix = static_cast<double>(HealpixGrid(study.nside).npix());
    const auto channels = static_cast<double>(plan.channels.size());
    const auto harmonic =
        static_cast<double>(std::count(plan.per_pixel.begin(), plan.per_pixel.end(), false));
    const double alm_values = 0.5 * (study.lmax + 1.0) * (study.lmax + 2.0);
    const double stokes = study.polarized ? 3 : 1;
    // Templates are read as whole maps and transformed before the maps are made; what stays is in
    // held_values.
    const double reading =
        plan.model_maps.largest_nside > 0
            ? 8 * 3 * static_cast<double>(HealpixGrid(plan.model_maps.largest_nside).npix())
            : 0.0;
    double making = 8 * static_cast<double>(plan.model_maps.held_values) +
                    8 * std::min(npix, strip_pixels) * (study.polarized ? 10 : 4);
    double transforms = 0;
    const double per_set = study.polarized ? 1 + spin2_factor : 1;
    if (harmonic > 0) {
        const double components = std::min(harmonic, usual_components);
        making += 8 * npix * (2 * stokes + 1) + 16 * alm_values * stokes * (components + 3);
        transforms = per_set * (components + 2 + harmonic);
    }
    plan.memory_bytes = static_cast<std::int64_t>(program_bytes + std::max(reading, making));
    plan.seconds = 0.1 + transforms * seconds_per_transform * study.nside * study.lmax * study.lmax +
                   seconds_per_pixel * npix * channels * stokes +
                   static_cast<double>(plan.disk_bytes) / bytes_per_second;
}

}  // namespace foreglow
