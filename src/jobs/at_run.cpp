// SPDX-License-Identifier: GPL-2.0-or-later
#include <array>
#include <cstdio>

#include "base/error.h"
#include "base/text.h"
#include "io/fits_pixel_reader.h"
#include "io/json_value.h"
#include "jobs/at_source.h"
#include "physics/spectral_law.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;

constexpr std::size_t most_open_maps = 128;  // well below the usual limit of 1024

FitsPixelReader open_columns(const fs::path& path, const std::vector<std::string>& names) {
    FitsMapRequest request;
    request.path = path;
    for (const std::string& name : names)
        request.columns.emplace_back(name);
    return FitsPixelReader(request);
}

bool has_column(const fs::path& path, const std::string& name) {
    FitsMapRequest request;
    request.path = path;
    for (const FitsMapColumnInfo& column : read_fits_map_header(request).columns)
        if (column.name == name) return true;
    return false;
}

std::vector<double> read_column(const FitsPixelReader& reader, std::span<const std::int64_t> pixels) {
    std::vector<double> values(pixels.size());
    const std::array<std::span<double>, 1> out{values};
    reader.read(pixels, out);
    return values;
}

/// A finished run's maps and truth, open.
struct RunMaps {
    fs::path folder;
    bool polarized = false, negate_u = false;
    std::vector<std::string> stokes;
    double factor = 1;  ///< from the unit of the files to that asked for
    struct Channel {
        fs::path map;
        Frequency at;
        std::shared_ptr<const FitsPixelReader> reader;  ///< stays open for the first of them
    };
    std::vector<Channel> channels;
    std::optional<FitsPixelReader> index, curvature, amplitude, own_index;
    Frequency reference;
    bool is_curved_law = true;  ///< else truth says what the spectrum is at its own frequency only
    std::vector<std::int64_t> pixels;
    SkyStrip truth;  ///< of the pixels loaded last
    struct Law {
        BandSum band;
        Frequency at;
    };
    std::vector<Law> laws;  ///< of frequencies asked for, which the truth answers

    void open_truth();
    void load(std::span<const std::int64_t> wanted);
    [[nodiscard]] PointValues channel_values(std::size_t k);
};

void RunMaps::open_truth() {
    std::error_code code;
    if (!fs::exists(folder / "truth/index.fits", code)) return;
    index.emplace(open_columns(folder / "truth/index.fits", {"INDEX"}));
    curvature.emplace(open_columns(folder / "truth/curvature.fits", {"CURVATURE"}));
    const auto hz = index->header().number("FREQ");
    if (!hz || !(*hz > 0))
        throw DataError((folder / "truth/index.fits").string() +
                        ": the card FREQ is missing, so no one knows where the index holds");
    reference = Frequency::from_hz(*hz);
}

void RunMaps::load(std::span<const std::int64_t> wanted) {
    pixels.assign(wanted.begin(), wanted.end());
    truth = {};
    if (!index) return;
    truth.index = read_column(*index, pixels);
    truth.curvature = read_column(*curvature, pixels);
    if (!amplitude) return;
    truth.intensity.resize(pixels.size());
    truth.q.resize(polarized ? pixels.size() : 0);
    truth.u.resize(truth.q.size());
    const std::array<std::span<double>, 3> out{truth.intensity, truth.q, truth.u};
    amplitude->read(pixels, std::span(out).first(polarized ? 3 : 1));
    if (own_index) {
        truth.polarized_index = read_column(*own_index, pixels);
        truth.polarized_curvature.assign(pixels.size(), 0.0);
    }
    if (negate_u)
        for (double& value : truth.u)
            value = -value;
}

PointValues RunMaps::channel_values(std::size_t k) {
    Channel& channel = channels[k];
    std::shared_ptr<const FitsPixelReader> reader = channel.reader;
    if (!reader) reader = std::make_shared<const FitsPixelReader>(open_columns(channel.map, stokes));
    if (k < most_open_maps) channel.reader = reader;
    PointValues values;
    values.brightness.resize(pixels.size());
    values.q.resize(polarized ? pixels.size() : 0);
    values.u.resize(values.q.size());
    const std::array<std::span<double>, 3> out{values.brightness, values.q, values.u};
    reader->read(pixels, std::span(out).first(stokes.size()));
    for (const std::span<double> column : out)
        for (double& value : column)
            value *= factor;
    if (negate_u)
        for (double& value : values.u)
            value = -value;
    if (truth.index.empty()) return values;
    values.index_reference = truth.index;
    if (!is_curved_law && !(channel.at == reference)) return values;
    values.curvature = truth.curvature;
    const double log_ratio = log_frequency_ratio(channel.at, reference);
    for (std::size_t i = 0; i < pixels.size(); ++i) {
        values.index.push_back(local_index({truth.index[i], truth.curvature[i]}, log_ratio));
        values.electron_slope.push_back(electron_slope(values.index.back()));
    }
    return values;
}

std::string realization_suffix(int realization) {
    std::array<char, 16> text{};
    std::snprintf(text.data(), text.size(), "_r%04d", realization);
    return text.data();
}

// NAME.fits, or NAME_r0003.fits of a run with several realizations.
fs::path find_map(const fs::path& folder, const std::string& name, std::optional<int> realization) {
    std::error_code code;
    fs::path plain = folder / "maps" / (name + ".fits");
    if (fs::exists(plain, code)) {
        if (realization.value_or(0) != 0)
            throw InputError("--realization " + std::to_string(*realization) + ": the run " +
                             folder.string() + " has one realization, 0");
        return plain;
    }
    for (int r = 0; !realization && r < 1000000; ++r)
        if (fs::exists(folder / "maps" / (name + realization_suffix(r) + ".fits"), code))
            return folder / "maps" / (name + realization_suffix(r) + ".fits");
    fs::path numbered = folder / "maps" / (name + realization_suffix(realization.value_or(0)) + ".fits");
    if (!fs::exists(numbered, code))
        throw InputError("the run " + folder.string() + " has no map of channel " + name +
                         (realization ? ", realization " + std::to_string(*realization) : "") +
                         ": was it moved away?");
    return numbered;
}

// A number of a manifest, however it is written.
std::optional<double> number_of(const JsonValue* value) {
    if (value == nullptr) return std::nullopt;
    if (const auto* real = std::get_if<double>(&value->storage())) return *real;
    if (const auto* whole = std::get_if<std::int64_t>(&value->storage())) return static_cast<double>(*whole);
    if (const auto* whole = std::get_if<std::uint64_t>(&value->storage())) return static_cast<double>(*whole);
    return std::nullopt;
}

// Whether a model's text has a section whose spectra are no curved power laws.
bool names_another_law(const std::string& model) {
    for (const std::string& line : split(model, '\n'))
        for (const char* section : {"[electrons", "[galaxy"})
            if (trim(line).starts_with(section)) return true;
    return false;
}

void read_channels(const AtOptions& options, RunMaps& run) {
    const fs::path manifest = run.folder / "run.json";
    std::error_code code;
    if (!fs::exists(manifest, code))
        throw InputError(run.folder.string() +
                         " has no run.json, so it is no finished run: name the folder that make left");
    const JsonValue json = read_json(manifest);
    if (const JsonValue* model = json.find("model"); model != nullptr && model->text() != nullptr)
        run.is_curved_law = !names_another_law(*model->text());
    const JsonValue* channels = json.find("channels");
    if (channels == nullptr || channels->array() == nullptr || channels->array()->empty())
        throw DataError(manifest.string() + ": there is no list of channels in it; the file is damaged");
    for (const JsonValue& channel : *channels->array()) {
        const JsonValue* name = channel.find("name");
        const JsonValue* hz = channel.find("frequency_Hz");
        const std::optional<double> frequency = number_of(hz);
        if (name == nullptr || name->text() == nullptr || !frequency)
            throw DataError(manifest.string() + ": a channel lacks its name or frequency_Hz");
        run.channels.push_back({find_map(run.folder, *name->text(), options.realization),
                                Frequency::from_hz(*frequency), nullptr});
    }
}

// From the unit of the run's maps to the one asked for: a power of ten, since a band's other units differ by
// its own calibration.
double unit_factor(const AtOptions& options, const std::string& unit) {
    if (!options.unit || *options.unit == unit) return 1;
    const auto from = find_brightness_unit(unit);
    const auto to = find_brightness_unit(*options.unit);
    if (!from || !to || from->kind != to->kind)
        throw InputError(
            "the run's maps are in " + unit + ", which --unit " + *options.unit +
            " does not follow from: ask for one that differs by a power of ten, or for the study "
            "itself");
    return from->scale / to->scale;
}

void open_law(const AtOptions& options, RunMaps& run, AtSource& source,
              const std::vector<Frequency>& frequencies) {
    if (!run.index)
        throw InputError(
            "the run " + run.folder.string() +
            " has no truth maps to answer at --frequency: leave it out for the channels' maps, or "
            "ask the study itself");
    if (!run.is_curved_law)
        throw InputError(
            "the spectra of the run " + run.folder.string() +
            " are no curved power laws, so its truth maps do not say what is at --frequency: ask "
            "the study itself");
    run.amplitude.emplace(open_columns(run.folder / "truth/amplitude.fits", run.stokes));
    if (run.polarized && has_column(run.folder / "truth/index.fits", "INDEX_POLARIZED"))
        run.own_index.emplace(open_columns(run.folder / "truth/index.fits", {"INDEX_POLARIZED"}));
    const auto unit = find_brightness_unit(options.unit.value_or("K_RJ"));
    if (!unit)
        throw InputError("--unit " + *options.unit + " is no unit of brightness: use one of " +
                         list_of_brightness_units());
    for (const Frequency frequency : frequencies) {
        run.laws.push_back({make_band_sum(Response::at(frequency), ResponseWeights::Temperature,
                                          {*unit, frequency, 0, source.grid.pixel_area()}),
                            frequency});
        source.columns.push_back({"", frequency, to_text(*unit)});
    }
    source.notices.emplace_back("rows at --frequency follow from the run's truth maps, before beams");
}

}  // namespace

AtSource open_run_at(const AtOptions& options) {
    std::error_code code;
    const fs::path folder = options.source;
    if (fs::exists(folder / "run.json", code) && fs::exists(folder / "index.fits", code) &&
        !fs::exists(folder / "maps", code))
        return open_index_map_at(options);  // what `foreglow index` left
    const auto frequencies = read_at_frequencies(options.frequencies);
    const auto run = std::make_shared<RunMaps>();
    run->folder = options.source;
    read_channels(options, *run);
    run->polarized = has_column(run->channels.front().map, "Q_STOKES");
    run->stokes = run->polarized ? std::vector<std::string>{"I_STOKES", "Q_STOKES", "U_STOKES"}
                                 : std::vector<std::string>{"I_STOKES"};
    run->channels.front().reader =
        std::make_shared<const FitsPixelReader>(open_columns(run->channels.front().map, run->stokes));
    const FitsMapHeader& header = run->channels.front().reader->header();
    if (!header.frame)
        throw DataError(header.path.string() + ": the card COORDSYS is missing; the file is damaged");
    run->open_truth();
    AtSource source;
    source.grid = header.grid;
    source.frame = *header.frame;
    source.polarized = run->polarized;
    source.convention = header.convention.value_or(PolarizationConvention::Cosmo);
    run->negate_u = source.convention == PolarizationConvention::Iau;
    source.has_index = source.has_curvature = run->index.has_value();
    source.load = [run](std::span<const std::int64_t> pixels) { run->load(pixels); };
    if (!frequencies.empty()) {
        open_law(options, *run, source, frequencies);
        source.values = [run](std::size_t k) {
            return make_point_values(run->truth, run->reference, run->reference, run->laws[k].band,
                                     run->laws[k].at);
        };
        return source;
    }
    const std::string unit = header.columns.at(static_cast<std::size_t>(header.requested.front() - 1)).unit;
    run->factor = unit_factor(options, unit);
    for (std::size_t k = 0; k < run->channels.size(); ++k)
        source.columns.push_back(
            {run->channels[k].map.stem().string(), run->channels[k].at, options.unit.value_or(unit)});
    source.notices.emplace_back(
        run->index ? "brightness, Q and U are the run's maps as written; index and curvature "
                     "are its truth, before beams"
                   : "brightness, Q and U are the run's maps as written; the run has no truth "
                     "maps, so there is no index");
    if (run->index && !run->is_curved_law)
        source.notices.emplace_back(
            "the model's spectra are no curved power laws: truth has the index at the reference frequency "
            "only, "
            "and the study itself answers with those at the channels' frequencies");
    source.values = [run](std::size_t k) { return run->channel_values(k); };
    return source;
}

}  // namespace foreglow
