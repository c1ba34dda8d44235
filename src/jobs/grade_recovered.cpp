// SPDX-License-Identifier: GPL-2.0-or-later
#include <algorithm>
#include <array>
#include <cmath>
#include <set>

#include "base/error.h"
#include "base/text.h"
#include "estimate/smoothed_truth.h"
#include "io/fits_map_read.h"
#include "jobs/grade_output.h"
#include "physics/spectral_law.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;

const std::array<std::string, 3> parameter_maps{"amplitude", "index", "curvature"};

/// A recovered map: what it is compared with, by its stem.
struct Recovered {
    fs::path path;
    std::string stem;
    std::optional<std::size_t> channel;  ///< else one of parameter_maps
};

std::vector<fs::path> list_maps(const std::vector<fs::path>& given) {
    std::vector<fs::path> out;
    std::error_code code;
    for (const fs::path& path : given) {
        if (!fs::exists(path, code))
            throw InputError(path.string() + " does not exist: name recovered maps or folders of them");
        if (!fs::is_directory(path, code)) {
            out.push_back(path);
            continue;
        }
        std::vector<fs::path> inside;
        for (const auto& entry : fs::directory_iterator(path))
            if (entry.path().extension() == ".fits") inside.push_back(entry.path());
        if (inside.empty()) throw InputError("the folder " + path.string() + " holds no .fits files");
        std::sort(inside.begin(), inside.end());
        out.insert(out.end(), inside.begin(), inside.end());
    }
    return out;
}

std::vector<Recovered> match_all(const GradeOptions& options, const GradeSource& source) {
    std::vector<std::string> stems(parameter_maps.begin(), parameter_maps.end());
    for (const GradeChannel& channel : source.channels) {
        stems.push_back(channel.map.stem().string());
        stems.push_back(channel.channel.name);
    }
    std::vector<Recovered> out;
    std::set<std::string> seen;
    for (const fs::path& path : list_maps(options.recovered)) {
        Recovered one{path, path.stem().string(), std::nullopt};
        for (std::size_t c = 0; c < source.channels.size(); ++c)
            if (one.stem == source.channels[c].map.stem().string() ||
                one.stem == source.channels[c].channel.name)
                one.channel = c;
        if (!one.channel &&
            std::find(parameter_maps.begin(), parameter_maps.end(), one.stem) == parameter_maps.end()) {
            const std::string nearest = nearest_word(one.stem, stems);
            throw InputError(
                path.string() + ": the run has no map of that name" +
                (nearest.empty() ? "" : "; did you mean " + nearest + ".fits?") +
                " (recovered maps are called as the run's channels, or amplitude, index, curvature)");
        }
        if (!seen.insert(one.stem).second)
            throw InputError(path.string() + ": there is another recovered map of that name: give each once");
        out.push_back(std::move(one));
    }
    return out;
}

/// The header of a recovered map, held against the run's.
FitsMapHeader check_header(const Recovered& one, const GradeSource& source, Progress& progress) {
    FitsMapRequest request;
    request.path = one.path;
    FitsMapHeader header = read_fits_map_header(request);
    if (header.grid.nside() != source.study.nside)
        throw InputError(one.path.string() + " has nside " + std::to_string(header.grid.nside()) +
                         " but the run has " + std::to_string(source.study.nside) +
                         ": bring it to the run's grid");
    if (header.frame && *header.frame != source.study.frame)
        throw InputError(one.path.string() + " is in the frame " + to_text(*header.frame) +
                         " but the run is in " + to_text(source.study.frame) + ": turn it first");
    if (!header.frame)
        progress.notice(one.path.filename().string() + " does not say its frame; it is taken to be " +
                        to_text(source.study.frame));
    return header;
}

std::string find_column(const FitsMapHeader& header, const std::string& name) {
    for (const FitsMapColumnInfo& column : header.columns)
        if (to_lower(column.name) == to_lower(name)) return column.name;
    return "";
}

std::string first_column(const FitsMapHeader& header) {
    for (const FitsMapColumnInfo& column : header.columns)
        if (!column.holds_pixel_numbers) return column.name;
    throw DataError(header.path.string() + " has no column of values");
}

double unit_factor(const Recovered& one, const FitsMapHeader& header, const std::string& column,
                   const BrightnessUnit& wanted, Progress& progress) {
    std::string text;
    for (const FitsMapColumnInfo& info : header.columns)
        if (info.name == column) text = info.unit;
    if (trim(text).empty()) {
        progress.notice(one.path.filename().string() + " does not say its unit; it is taken to be " +
                        to_text(wanted));
        return 1;
    }
    const auto unit = find_brightness_unit(text);
    if (!unit || unit->kind != wanted.kind)
        throw InputError(one.path.string() + ": column " + column + " is in '" + text +
                         "' but the truth is in " + to_text(wanted) + ": bring it to that unit");
    return unit->scale / wanted.scale;
}

/// Compares pairs of maps, each under every sky cut and in every band of l.
class RecoveredGrade {
  public:
    RecoveredGrade(const GradeOptions& options, const GradeSource& source, GradeOutput& output,
                   Progress& progress)
        : options_(options),
          source_(source),
          output_(output),
          progress_(progress),
          grid_(source.study.nside),
          lmax_(std::min(source.study.lmax, 2 * source.study.nside)),
          spectra_(grid_, lmax_) {
        const PixelSelection mask = options.mask
                                        ? read_grade_mask(*options.mask, grid_, source.study.frame, progress)
                                        : PixelSelection();
        for (const double cut : options.cuts) {
            if (!(cut >= 0 && cut < 90))
                throw InputError("--cut " + format_number(cut, 6) +
                                 ": a galactic latitude from 0 to below 90 degrees is wanted");
            selections_.push_back(both_of(mask, select_latitudes(grid_, source.study.frame, cut)));
        }
    }

    ResultRows run() {
        const std::vector<Recovered> all = match_all(options_, source_);
        progress_.begin("comparing", static_cast<std::int64_t>(all.size()));
        for (std::size_t i = 0; i < all.size(); ++i) {
            const FitsMapHeader header = check_header(all[i], source_, progress_);
            if (all[i].channel)
                compare_channel(all[i], header);
            else
                compare_parameter(all[i], header);
            progress_.step(static_cast<std::int64_t>(i) + 1);
        }
        progress_.end();
        return std::move(rows_);
    }

  private:
    void compare_channel(const Recovered& one, const FitsMapHeader& header) {
        const GradeChannel& channel = source_.channels[*one.channel];
        for (const std::string name : {"I_STOKES", "Q_STOKES", "U_STOKES"}) {
            std::string column = find_column(header, name);
            if (name == "I_STOKES" && column.empty()) column = first_column(header);
            if (column.empty() || (name != "I_STOKES" && !source_.study.polarized)) continue;
            const double factor = unit_factor(one, header, column, source_.study.unit, progress_);
            std::vector<double> values = read_grade_column(one.path, column);
            for (double& value : values)
                value *= factor;
            if (name == "U_STOKES" && header.convention && *header.convention != source_.study.convention)
                for (double& value : values)
                    value = -value;
            compare(one.stem, name, channel.channel.reference, to_text(source_.study.unit), values,
                    read_grade_column(channel.map, name));
        }
    }

    // The truth before beams, at the frequency where the recovered map holds, at its resolution.
    PixelLaws make_truth(const Recovered& one, const FitsMapHeader& header) {
        const fs::path truth = source_.folder / "truth";
        std::error_code code;
        for (const char* name : {"amplitude.fits", "index.fits", "curvature.fits"})
            if (!fs::exists(truth / name, code))
                throw InputError("the run " + source_.folder.string() + " has no truth maps to compare " +
                                 one.path.string() + " with: make it with `truth = true`");
        FitsMapRequest request;
        request.path = truth / "index.fits";
        const auto hz = read_fits_map_header(request).number("FREQ");
        if (!hz || !(*hz > 0))
            throw DataError(request.path.string() + ": the card FREQ is missing; the file is damaged");
        PixelLaws laws;
        laws.brightness = {grid_, source_.study.frame, "K_RJ",
                           read_grade_column(truth / "amplitude.fits", "I_STOKES")};
        laws.index = read_grade_column(truth / "index.fits", "INDEX");
        laws.curvature = read_grade_column(truth / "curvature.fits", "CURVATURE");
        frequency_ = Frequency::from_hz(header.number("FREQ").value_or(*hz));
        if (!header.number("FREQ"))
            progress_.notice(one.path.filename().string() +
                             " does not say its frequency (FREQ); it is taken to "
                             "hold at " +
                             to_text(frequency_));
        carry_laws(laws, log_frequency_ratio(frequency_, Frequency::from_hz(*hz)));
        return smooth_laws(laws, beam_of(one, header), source_.study.lmax);
    }

    Angle beam_of(const Recovered& one, const FitsMapHeader& header) {
        if (options_.common_beam) return *options_.common_beam;
        for (const char* card : {"BEAMFWHM", "SKYFWHM"})
            if (const auto degrees = header.number(card); degrees && *degrees > 0)
                return Angle::from_degrees(*degrees);
        progress_.notice(
            one.path.filename().string() +
            " does not say its resolution (BEAMFWHM or SKYFWHM) and --common-beam is not given: it is "
            "compared with the truth before beams");
        return {};
    }

    void compare_parameter(const Recovered& one, const FitsMapHeader& header) {
        const PixelLaws laws = make_truth(one, header);
        std::string name = one.stem;
        std::transform(name.begin(), name.end(), name.begin(),
                       [](unsigned char c) { return static_cast<char>(std::toupper(c)); });
        std::string column = find_column(header, name);
        if (column.empty()) column = first_column(header);
        std::vector<double> values = read_grade_column(one.path, column);
        if (one.stem == "amplitude") {
            const double factor = unit_factor(one, header, column, BrightnessUnit{}, progress_);
            for (double& value : values)
                value *= factor;
            compare(one.stem, column, frequency_, "K_RJ", values, laws.brightness.values);
        } else {
            compare(one.stem, column, frequency_, "1", values,
                    one.stem == "index" ? laws.index : laws.curvature);
        }
    }

    void compare(const std::string& stem, const std::string& column, Frequency frequency,
                 const std::string& unit, const std::vector<double>& values,
                 const std::vector<double>& truth) {
        std::vector<double> residual(values.size()), reference(values.size());
        for (std::size_t p = 0; p < values.size(); ++p) {
            residual[p] = values[p] - truth[p];
            reference[p] = is_defined(residual[p]) ? truth[p] : undefined_pixel;
        }
        output_.write_residual(stem + (column == "Q_STOKES"   ? "_Q"
                                       : column == "U_STOKES" ? "_U"
                                                              : ""),
                               grid_, "RESIDUAL", unit == "1" ? "" : unit, residual,
                               {{"FREQ", frequency.hz(), "[Hz] where this holds"}});
        for (std::size_t k = 0; k < selections_.size(); ++k) {
            const ResidualStatistics s = make_residual_statistics(residual, selections_[k]);
            const ResidualStatistics t = make_residual_statistics(reference, selections_[k]);
            const double cut = options_.cuts[k];
            if (s.pixels == 0)
                throw InputError(stem + ": no pixel is defined in both maps beyond |b| = " +
                                 format_number(cut, 6) + " deg: nothing is left to compare");
            rows_.add({stem, column, frequency.hz(), cut, JsonValue(), JsonValue(), s.pixels, s.mean, s.rms,
                       s.p5, s.p50, s.p95, t.rms, t.rms > 0 ? JsonValue(s.rms / t.rms) : JsonValue(), unit});
            const auto residual_cl = spectra_.of(residual, selections_[k]);
            const auto truth_cl = spectra_.of(reference, selections_[k]);
            output_.add_spectrum(stem, column, cut, residual_cl, truth_cl);
            for (const LBand& band : make_l_bands(lmax_)) {
                const double left = rms_in_band(residual_cl, band), all = rms_in_band(truth_cl, band);
                rows_.add({stem, column, frequency.hz(), cut, band.low, band.high, s.pixels, JsonValue(),
                           left, JsonValue(), JsonValue(), JsonValue(), all,
                           all > 0 ? JsonValue(left / all) : JsonValue(), unit});
            }
        }
    }

    const GradeOptions& options_;
    const GradeSource& source_;
    GradeOutput& output_;
    Progress& progress_;
    HealpixGrid grid_;
    int lmax_;
    MaskedSpectra spectra_;
    Frequency frequency_;
    std::vector<PixelSelection> selections_;
    ResultRows rows_{{"map", "column", "frequency_Hz", "cut_deg", "l_low", "l_high", "pixels", "mean", "rms",
                      "p5", "p50", "p95", "truth_rms", "ratio", "unit"}};
};

}  // namespace

ResultRows grade_recovered(const GradeOptions& options, const GradeSource& source, GradeOutput& output,
                           Progress& progress) {
    return RecoveredGrade(options, source, output, progress).run();
}

}  // namespace foreglow
