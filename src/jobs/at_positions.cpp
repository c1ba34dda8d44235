// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/at_positions.h"

#include <algorithm>
#include <charconv>
#include <cmath>

#include "base/error.h"
#include "base/parallel.h"
#include "base/text.h"
#include "io/line_stream.h"
#include "io/text_file.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 4096;  // lines of one task
constexpr std::size_t absent = static_cast<std::size_t>(-1);

/// Where the columns of a table are.
struct TableColumns {
    std::size_t lon = 0, lat = 1, pixel = absent;
};

std::string_view cell_of(std::string_view line, std::size_t column) {
    for (; column > 0; --column) {
        const auto comma = line.find(',');
        if (comma == std::string_view::npos) return {};
        line.remove_prefix(comma + 1);
    }
    return trim(line.substr(0, line.find(',')));
}

bool is_number(std::string_view text) {
    if (text.starts_with('+')) text.remove_prefix(1);
    double value = 0;
    const auto [end, code] = std::from_chars(text.data(), text.data() + text.size(), value);
    return code == std::errc() && (end == text.data() + text.size() || *end == ':');
}

std::string_view without_quotes(std::string_view cell) {
    if (cell.size() >= 2 && cell.front() == '"' && cell.back() == '"') return cell.substr(1, cell.size() - 2);
    return cell;
}

std::optional<TableColumns> find_columns(std::string_view header) {
    TableColumns columns{absent, absent, absent};
    std::size_t number = 0;
    for (const std::string& cell : split(header, ',')) {
        const std::string name = to_lower(without_quotes(trim(cell)));
        for (const char* word : {"lon_deg", "lon", "l", "ra", "ra_deg"})
            if (name == word) columns.lon = number;
        for (const char* word : {"lat_deg", "lat", "b", "dec", "dec_deg"})
            if (name == word) columns.lat = number;
        if (name == "pixel") columns.pixel = number;
        ++number;
    }
    const bool has_place = columns.lon != absent && columns.lat != absent;
    if (has_place) columns.pixel = absent;
    if (!has_place && columns.pixel == absent) return std::nullopt;
    return columns;
}

void check_pixel(std::int64_t pixel, const HealpixGrid& grid, const std::string& start) {
    if (pixel < 0 || pixel >= grid.npix())
        throw InputError(start + "there is no pixel " + std::to_string(pixel) + " at nside " +
                         std::to_string(grid.nside()) + ": give one from 0 to " +
                         std::to_string(grid.npix() - 1));
}

}  // namespace

struct PositionReader::Impl {
    Impl(const AtOptions& options_in, Frame frame_in, std::optional<HealpixGrid> grid_in)
        : options(options_in), frame(frame_in), grid(grid_in) {}

    [[nodiscard]] PositionBatch read_arguments() const;
    void read_header(std::string_view line, std::size_t number);
    void read_line(std::string_view line, std::size_t place, PositionBatch& batch) const;
    [[nodiscard]] std::int64_t to_ring(std::int64_t pixel) const {
        return options.nested ? grid->nested_to_ring(pixel) : pixel;
    }
    [[nodiscard]] SkyPosition centre_of(std::int64_t ring_pixel) const {
        return position_of(grid->direction(ring_pixel));
    }

    AtOptions options;
    Frame frame;
    std::optional<HealpixGrid> grid;
    std::unique_ptr<LineStream> table;
    std::optional<TableColumns> columns;
    bool done = false;
};

PositionReader::PositionReader(const AtOptions& options, Frame frame, std::optional<HealpixGrid> pixel_grid)
    : impl_(std::make_unique<Impl>(options, frame, pixel_grid)) {
    const int ways = (options.positions.empty() ? 0 : 1) + (options.pixels.empty() ? 0 : 1) +
                     (options.positions_file ? 1 : 0);
    if (ways == 0)
        throw InputError(
            "say where to look: --position \"LON,LAT\", --pixel N --nside M, or --positions FILE.csv");
    if (ways > 1)
        throw InputError("--position, --pixel and --positions contradict each other: use one of them");
    if (!options.pixels.empty() && !pixel_grid)
        throw InputError("--pixel needs the grid it counts on: add --nside, such as --nside 64");
    if (options.positions_file)
        impl_->table = std::make_unique<LineStream>(*options.positions_file, "table of positions");
}

PositionReader::~PositionReader() = default;

PositionBatch PositionReader::Impl::read_arguments() const {
    PositionBatch batch;
    for (const std::string& text : options.positions) {
        const std::vector<std::string> parts = split(text, ',');
        if (parts.size() != 2)
            throw InputError("--position " + to_one_line(text) +
                             ": write longitude and latitude with a comma between, \"LON,LAT\"");
        try {
            batch.positions.push_back(parse_position(parts[0], parts[1], frame));
        } catch (const InputError& error) {
            throw InputError("--position " + to_one_line(text) + ": " + error.what());
        }
    }
    for (const std::int64_t pixel : options.pixels) {
        check_pixel(pixel, *grid, "--pixel: ");
        batch.pixels.push_back(to_ring(pixel));
        batch.positions.push_back(centre_of(batch.pixels.back()));
    }
    return batch;
}

void PositionReader::Impl::read_header(std::string_view line, std::size_t number) {
    if (const auto found = find_columns(line)) {
        columns = found;
    } else if (is_number(cell_of(line, 0)) && is_number(cell_of(line, 1))) {
        columns.emplace();
    } else {
        throw DataError(table->place(number) +
                        ": the first line must name the columns: put lon_deg,lat_deg (or pixel) above the "
                        "numbers");
    }
    if (columns->pixel != absent && !grid)
        throw InputError(table->place(number) +
                         ": pixel numbers need the grid they count on: add --nside, such as --nside 64");
}

void PositionReader::Impl::read_line(std::string_view line, std::size_t place, PositionBatch& batch) const {
    if (columns->pixel == absent) {
        batch.positions[place] =
            parse_position(cell_of(line, columns->lon), cell_of(line, columns->lat), frame);
        return;
    }
    const std::string_view cell = cell_of(line, columns->pixel);
    std::int64_t pixel = 0;
    const auto [end, code] = std::from_chars(cell.data(), cell.data() + cell.size(), pixel);
    if (code != std::errc() || end != cell.data() + cell.size())
        throw InputError("'" + std::string(cell) + "' is no pixel number");
    check_pixel(pixel, *grid, "");
    batch.pixels[place] = to_ring(pixel);
    batch.positions[place] = centre_of(batch.pixels[place]);
}

std::optional<PositionBatch> PositionReader::next() {
    if (impl_->done) return std::nullopt;
    if (!impl_->table) {
        impl_->done = true;
        return impl_->read_arguments();
    }
    while (impl_->table->next()) {
        std::vector<std::pair<std::string_view, std::size_t>> wanted;  // lines of numbers, with their place
        const auto& lines = impl_->table->lines();
        for (std::size_t i = 0; i < lines.size(); ++i) {
            const std::string_view line = trim(lines[i]);
            if (line.empty() || line.front() == '#') continue;
            const bool is_first = !impl_->columns;
            if (is_first) impl_->read_header(line, i);
            if (!is_first || is_number(cell_of(line, 0))) wanted.emplace_back(line, i);
        }
        if (wanted.empty()) continue;
        PositionBatch batch;
        batch.positions.resize(wanted.size());
        if (impl_->columns->pixel != absent) batch.pixels.resize(wanted.size());
        parallel_for_blocks(
            static_cast<std::int64_t>(wanted.size()), block, [&](std::int64_t begin, std::int64_t end) {
                for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i) {
                    try {
                        impl_->read_line(wanted[i].first, i, batch);
                    } catch (const InputError& error) {
                        throw DataError(
                            to_one_line(impl_->table->place(wanted[i].second) + ": " + error.what()));
                    }
                }
            });
        return batch;
    }
    impl_->done = true;
    return std::nullopt;
}

}  // namespace foreglow
