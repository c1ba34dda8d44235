// SPDX-License-Identifier: GPL-2.0-or-later
#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>

#include "base/error.h"
#include "base/text.h"
#include "io/fits_pixel_reader.h"
#include "jobs/at_source.h"
#include "physics/spectral_law.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

/// An index map, perhaps with curvature and amplitude beside it, open.
struct IndexMap {
    explicit IndexMap(const FitsMapRequest& request) : reader(request) {}

    FitsPixelReader reader;
    std::optional<FitsPixelReader> amplitude_file;    ///< where it is a file of its own
    std::optional<std::size_t> curvature, amplitude;  ///< places among the columns read
    std::optional<Frequency> reference;
    struct Law {
        std::optional<Frequency> at;
        double factor = 1;  ///< from K_RJ to the unit asked for
    };
    std::vector<Law> laws;
    double amplitude_factor = 1;  ///< from the file's unit to K_RJ
    std::vector<std::vector<double>> columns;

    void load(std::span<const std::int64_t> pixels);
    [[nodiscard]] PointValues values(std::size_t k) const;
};

void IndexMap::load(std::span<const std::int64_t> pixels) {
    columns.assign(reader.header().requested.size(), std::vector<double>(pixels.size()));
    std::vector<std::span<double>> out;
    out.reserve(columns.size());
    for (std::vector<double>& column : columns)
        out.emplace_back(column);
    reader.read(pixels, out);
    if (!amplitude_file) return;
    const std::array<std::span<double>, 1> amplitudes{columns.emplace_back(pixels.size())};
    amplitude_file->read(pixels, amplitudes);
}

PointValues IndexMap::values(std::size_t k) const {
    const Law& law = laws[k];
    const double log_ratio = law.at && reference ? log_frequency_ratio(*law.at, *reference) : 0.0;
    const std::size_t n = columns[0].size();
    PointValues out;
    out.index_reference = columns[0];
    if (curvature) out.curvature = columns[*curvature];
    out.index.resize(n);
    out.electron_slope.resize(n);
    if (amplitude) out.brightness.resize(n);
    for (std::size_t i = 0; i < n; ++i) {
        const SpectralParameters parameters{columns[0][i], curvature ? out.curvature[i] : 0.0};
        out.index[i] = local_index(parameters, log_ratio);
        out.electron_slope[i] = electron_slope(out.index[i]);
        if (amplitude)
            out.brightness[i] = columns[*amplitude][i] * amplitude_factor *
                                std::exp(log_brightness_ratio(parameters, log_ratio)) * law.factor;
    }
    if (amplitude) out.amplitude = columns[*amplitude];
    return out;
}

FitsMapRequest make_index_request(const AtOptions& options) {
    FitsMapRequest request;
    request.path = options.source;
    request.hdu = options.hdu;
    request.ordering = options.map_ordering;
    request.frame = options.map_frame;
    if (!options.column) return request;
    int number = 0;
    const std::string& text = *options.column;
    const auto [end, code] = std::from_chars(text.data(), text.data() + text.size(), number);
    if (code == std::errc() && end == text.data() + text.size())
        request.columns.emplace_back(number);
    else
        request.columns.emplace_back(text);
    return request;
}

const FitsMapColumnInfo* find_named(const FitsMapHeader& header, std::initializer_list<const char*> names) {
    for (const char* name : names)
        for (const FitsMapColumnInfo& column : header.columns)
            if (to_lower(column.name) == name && !column.holds_pixel_numbers) return &column;
    return nullptr;
}

// The index column, what stands beside it, and what the header must say.
void check_index_header(const AtOptions& options, const FitsMapHeader& header,
                        const FitsMapColumnInfo& column) {
    if (find_brightness_unit(column.unit))
        throw InputError(
            options.source + ": column " + column.name + " is in " + column.unit +
            ", a brightness and no index: name the index with --column, or write a model for this "
            "map (`foreglow start --model-for`)");
    if (!header.ordering)
        throw InputError(options.source +
                         " does not say in which order its pixels are (ORDERING): add --map-ordering ring or "
                         "--map-ordering nested");
    if (!header.frame)
        throw InputError(options.source +
                         " does not say its frame (COORDSYS): add --map-frame galactic, icrs or ecliptic");
}

std::shared_ptr<IndexMap> open_index_map(const AtOptions& options) {
    FitsMapRequest request = make_index_request(options);
    const FitsMapHeader header = read_fits_map_header(request);
    const FitsMapColumnInfo* chosen =
        options.column ? nullptr : find_named(header, {"index", "beta", "spectral_index"});
    if (chosen == nullptr && !header.requested.empty())
        chosen = &header.columns[static_cast<std::size_t>(header.requested.front() - 1)];
    if (chosen == nullptr)
        throw DataError(options.source + ": there is no column but the pixel numbers in this map");
    check_index_header(options, header, *chosen);
    request.columns = {chosen->number};
    const FitsMapColumnInfo* curvature = find_named(header, {"curvature"});
    const FitsMapColumnInfo* amplitude = find_named(header, {"amplitude", "i_stokes"});
    const auto hz = header.number("FREQ");
    const bool has_reference = hz && *hz > 0 && std::isfinite(*hz);
    const auto unit = amplitude == nullptr ? std::nullopt : find_brightness_unit(amplitude->unit);
    if (curvature != nullptr) request.columns.emplace_back(curvature->number);
    const bool has_amplitude = unit && has_reference;
    if (has_amplitude) request.columns.emplace_back(amplitude->number);
    auto map = std::make_shared<IndexMap>(request);
    if (has_reference) map->reference = Frequency::from_hz(*hz);
    if (curvature != nullptr) map->curvature = 1;
    if (has_amplitude) {
        map->amplitude = request.columns.size() - 1;
        map->amplitude_factor = rayleigh_jeans_per_unit(*unit, *map->reference, header.grid.pixel_area());
    }
    return map;
}

// The amplitude that `foreglow index` leaves beside its index map.
void open_amplitude_beside(IndexMap& map, const std::filesystem::path& folder) {
    FitsMapRequest request;
    request.path = folder / "amplitude.fits";
    request.columns.emplace_back("AMPLITUDE");
    std::error_code code;
    if (map.amplitude || !map.reference || !std::filesystem::exists(request.path, code)) return;
    FitsPixelReader reader(request);
    const FitsMapHeader& header = reader.header();
    const auto unit =
        find_brightness_unit(header.columns.at(static_cast<std::size_t>(header.requested.front() - 1)).unit);
    if (!unit || !(header.grid == map.reader.header().grid) || header.frame != map.reader.header().frame)
        return;
    map.amplitude = map.reader.header().requested.size();
    map.amplitude_factor = rayleigh_jeans_per_unit(*unit, *map.reference, header.grid.pixel_area());
    map.amplitude_file.emplace(std::move(reader));
}

void add_laws(const AtOptions& options, IndexMap& map, AtSource& source) {
    const auto unit = find_brightness_unit(options.unit.value_or("K_RJ"));
    if (!unit)
        throw InputError("--unit " + *options.unit + " is no unit of brightness: use one of " +
                         list_of_brightness_units());
    std::vector<std::optional<Frequency>> wanted;
    for (const Frequency frequency : read_at_frequencies(options.frequencies))
        wanted.emplace_back(frequency);
    if (map.curvature && !map.reference && !wanted.empty())
        throw InputError(options.source +
                         " has a curvature but does not say at which frequency its index holds (FREQ): leave "
                         "--frequency out");
    if (wanted.empty()) wanted.push_back(map.reference);
    for (const auto& frequency : wanted) {
        const double factor =
            map.amplitude ? 1 / rayleigh_jeans_per_unit(*unit, *frequency, source.grid.pixel_area()) : 1.0;
        map.laws.push_back({frequency, factor});
        source.columns.push_back({"", frequency, map.amplitude ? to_text(*unit) : ""});
    }
}

}  // namespace

AtSource open_index_map_at(const AtOptions& request) {
    std::error_code code;
    AtOptions options = request;
    const bool is_folder = std::filesystem::is_directory(request.source, code);
    if (is_folder) options.source = (std::filesystem::path(request.source) / "index.fits").string();
    const auto map = open_index_map(options);
    if (is_folder) open_amplitude_beside(*map, request.source);
    const FitsMapHeader& header = map->reader.header();
    AtSource source;
    source.grid = header.grid;
    source.frame = *header.frame;
    source.has_brightness = map->amplitude.has_value();
    source.has_curvature = map->curvature.has_value();
    source.notices = header.notices;
    add_laws(options, *map, source);
    const std::string column = header.columns[static_cast<std::size_t>(header.requested.front() - 1)].name;
    source.notices.push_back("column " + column +
                             " is taken as the index of brightness temperature, T ~ nu^index" +
                             (map->reference ? ", at " + to_text(*map->reference) : ""));
    if (!source.has_brightness && options.unit)
        source.notices.emplace_back(
            "the map has no amplitude, so there is no brightness and --unit does nothing");
    source.load = [map](std::span<const std::int64_t> pixels) { map->load(pixels); };
    source.values = [map](std::size_t k) { return map->values(k); };
    return source;
}

}  // namespace foreglow
