// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/error.h"
#include "jobs/at_source.h"
#include "model/bundled_models.h"
#include "model/channel.h"
#include "model/galaxy_maps.h"
#include "model/model_file.h"
#include "model/point_sky.h"
#include "model/study_file.h"

namespace foreglow {
namespace {

/// A model's sky and the channels or frequencies asked of it.
struct ModelRows {
    explicit ModelRows(PointSky sky_in) : sky(std::move(sky_in)) {}

    PointSky sky;
    std::vector<PointRow> rows;
    std::vector<PointValues> values;  ///< of the pixels loaded last
};

BrightnessUnit read_asked_unit(const AtOptions& options, const BrightnessUnit& otherwise) {
    if (!options.unit) return otherwise;
    const auto unit = find_brightness_unit(*options.unit);
    if (!unit)
        throw InputError("--unit " + *options.unit + " is no unit of brightness: use one of " +
                         list_of_brightness_units());
    return *unit;
}

void refuse_map_options(const AtOptions& options) {
    if (options.column || options.hdu || options.map_frame || options.map_ordering)
        throw InputError("--column, --hdu, --map-frame and --map-ordering are of an index map, and " +
                         options.source + " is none: leave them out");
}

AtSource make_source(const std::shared_ptr<ModelRows>& rows) {
    AtSource source;
    source.grid = rows->sky.grid();
    source.frame = rows->sky.frame();
    source.polarized = rows->sky.is_polarized();
    source.notices = rows->sky.notices();
    source.load = [rows](std::span<const std::int64_t> pixels) {
        rows->values = rows->sky.answer(pixels, rows->rows);
    };
    source.values = [rows](std::size_t k) { return std::move(rows->values[k]); };
    return source;
}

void add_frequencies(AtSource& source, ModelRows& rows, const std::vector<Frequency>& frequencies,
                     const BrightnessUnit& unit) {
    for (const Frequency frequency : frequencies) {
        const Calibration calibration{unit, frequency, 0, source.grid.pixel_area()};
        rows.rows.push_back(
            {make_band_sum(Response::at(frequency), ResponseWeights::Temperature, calibration),
             frequency,
             {}});
        source.columns.push_back({"", frequency, to_text(unit)});
    }
}

// Such a sky has no grid of its own, and always polarization.
bool is_made_of_formulas(const ModelSpec& model) {
    return model.sketch.has_value() || model.galaxy.has_value();
}

PointRow make_row(const Channel& channel) {
    PointRow row{channel.band, channel.reference, {}};
    if (channel.bandwidth)
        row.refine = [channel](double step) { return refine_band(channel, {step, most_band_nodes}); };
    return row;
}

ModelSpec read_model_of(const std::string& name, bool bundled) {
    return bundled ? read_bundled_model(name) : read_model(name);
}

PointSky open_study_sky(const AtOptions& options, const StudySpec& study, const ModelSpec& model) {
    const int realization = options.realization.value_or(0);
    if (realization < 0 || realization >= study.realizations)
        throw InputError("--realization " + std::to_string(realization) +
                         ": the study has realizations 0 to " + std::to_string(study.realizations - 1));
    const HealpixGrid grid(study.nside);
    if (!is_random(model)) return {model, grid, study.polarized};
    return {model, grid, study.polarized, study.lmax, study.seed, realization};
}

void add_study_notices(AtSource& source, const StudySpec& study, const std::vector<Channel>& channels) {
    bool smoothed = false;
    for (const Channel& channel : channels)
        smoothed = smoothed || channel.beam || study.pixel_window;
    if (smoothed) source.notices.emplace_back("rows are of the sky before the channels' beams");
    if (study.remove_monopole)
        source.notices.emplace_back(
            "monopole = \"remove\": the mean, which is known from the whole map only, is not subtracted "
            "here");
    if (study.coverage)
        source.notices.emplace_back(
            "the study's coverage is not looked at: rows outside it are answered too");
    if (study.frame != source.frame)
        source.notices.push_back("the study's maps are in " + to_text(study.frame) +
                                 ": rows are pixels of the template's frame, " + to_text(source.frame) +
                                 ", which make turns through their a_lm");
}

}  // namespace

AtSource open_model_at(const AtOptions& options) {
    refuse_map_options(options);
    const auto frequencies = read_at_frequencies(options.frequencies);
    if (frequencies.empty())
        throw InputError("a model by itself has no channels: say where to look with --frequency \"70 MHz\"");
    const ModelSpec model = read_model_of(options.source, find_bundled_model(options.source) != nullptr);
    const bool tangled = model.electrons && model.electrons->law.geometry == FieldGeometry::Tangled;
    const bool polarized = !tangled && (is_made_of_formulas(model) || model.polarization);
    std::optional<HealpixGrid> grid;
    if (is_made_of_formulas(model) && options.nside) grid = HealpixGrid(*options.nside);
    const auto rows = std::make_shared<ModelRows>(PointSky(model, grid, polarized));
    AtSource source = make_source(rows);
    source.has_own_slope = model.electrons.has_value();
    source.takes_nside = is_made_of_formulas(model);
    if (!source.takes_nside)
        source.notices.push_back("each position is answered by the intensity template's own pixel, nside " +
                                 std::to_string(source.grid.nside()));
    source.notices.insert(source.notices.end(), model.warnings.begin(), model.warnings.end());
    add_frequencies(source, *rows, frequencies, read_asked_unit(options, BrightnessUnit{}));
    return source;
}

AtSource open_study_at(const AtOptions& options) {
    refuse_map_options(options);
    const auto frequencies = read_at_frequencies(options.frequencies);
    StudySpec study = read_study(options.source, {});
    study.unit = read_asked_unit(options, study.unit);
    const ModelSpec model = read_model_of(study.model, study.model_is_bundled);
    if (study.polarized && !is_made_of_formulas(model) && !model.polarization)
        throw InputError(study.model_place + ": the study asks for stokes = \"IQU\" but the model " +
                         model.name +
                         " has no [polarization]: add one to the model, or set `stokes = \"I\"`");
    const auto rows = std::make_shared<ModelRows>(open_study_sky(options, study, model));
    AtSource source = make_source(rows);
    source.has_own_slope = model.electrons.has_value();
    source.convention = study.convention;
    if (!frequencies.empty()) {
        add_frequencies(source, *rows, frequencies, study.unit);
        add_study_notices(source, study, {});
        return source;
    }
    const std::vector<Channel> channels = make_channels(study);
    for (const Channel& channel : channels) {
        rows->rows.push_back(make_row(channel));
        source.columns.push_back({channel.name, channel.reference, to_text(study.unit)});
    }
    add_study_notices(source, study, channels);
    return source;
}

}  // namespace foreglow
