// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/map_pieces.h"

#include <algorithm>

namespace foreglow {
namespace {

constexpr std::int64_t piece_pixels =
    8192;  // the sky of a piece and its columns stay in the second-level cache
constexpr int preview_nside = 128;

/// Returns the place along its ring of the pixel that touches the centre of a coarser grid's pixel from the
/// north, a child of it: in each quarter of a cap, pixel k of ring i is number k of i in steps of the edge
/// lines (Gorski et al. 2005, section 5.1), and in the belt both centres have one azimuth.
std::int64_t column_of_child(const HealpixGrid& coarse, int ring, int column, int finer) {
    const int n = coarse.nside(), from_north = ring + 1, from_south = 4 * n - from_north;
    const std::int64_t f = finer;
    if (from_north <= n)
        return column / from_north * (f * from_north - 1) + column % from_north * f + f / 2 - 1;
    if (from_south < n) return column / from_south * (f * from_south + 1) + column % from_south * f + f / 2;
    const HealpixGrid::Ring from = coarse.ring(ring);
    // Centres of ring f r - 1 are shifted by half a pixel where (f r - 1) - f n is even: never, as f is.
    const double shift = from.phi0 > 0 ? 0.5 : 0.0;
    return static_cast<std::int64_t>(static_cast<double>(f) * (column + shift));
}

}  // namespace

std::vector<MapPiece> cut_into_pieces(const HealpixGrid& grid, const RingStrip& strip) {
    std::vector<MapPiece> pieces;
    for (const PixelRange& range : pixel_ranges(grid, strip))
        for (std::int64_t from = 0; from < range.count; from += piece_pixels) {
            const std::int64_t to = std::min(range.count, from + piece_pixels);
            pieces.push_back({range.first_pixel + from, static_cast<std::size_t>(range.offset + from),
                              static_cast<std::size_t>(range.offset + to)});
        }
    return pieces;
}

PreviewSampler::PreviewSampler(const HealpixGrid& grid, Frame frame, const std::string& unit,
                               std::size_t columns, std::string channel) {
    const HealpixGrid small(std::min(preview_nside, grid.nside()));
    preview_.channel = std::move(channel);
    SkyMap empty{small, frame, unit,
                 std::vector<double>(static_cast<std::size_t>(small.npix()), undefined_pixel)};
    preview_.columns.assign(columns, empty);
    places_.reserve(static_cast<std::size_t>(small.npix()));
    const int finer = grid.nside() / small.nside();
    for (int r = 0; r < small.ring_count(); ++r) {
        // Rings and columns ascend together, which leaves the places in order.
        const HealpixGrid::Ring from = small.ring(r);
        const HealpixGrid::Ring to = grid.ring(finer == 1 ? r : finer * (r + 1) - 2);
        for (int c = 0; c < from.pixels; ++c)
            places_.push_back({to.first_pixel + (finer == 1 ? c : column_of_child(small, r, c, finer)),
                               from.first_pixel + c});
    }
}

void PreviewSampler::sample(std::int64_t first_pixel, std::span<const std::span<double>> columns) {
    const std::int64_t end = first_pixel + static_cast<std::int64_t>(columns[0].size());
    auto place = std::lower_bound(places_.begin(), places_.end(), first_pixel,
                                  [](const Place& p, std::int64_t pixel) { return p.pixel < pixel; });
    for (; place != places_.end() && place->pixel < end; ++place)
        for (std::size_t c = 0; c < columns.size(); ++c)
            preview_.columns[c].values[static_cast<std::size_t>(place->target)] =
                columns[c][static_cast<std::size_t>(place->pixel - first_pixel)];
}

}  // namespace foreglow
