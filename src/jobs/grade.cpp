// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/grade.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/parallel.h"
#include "base/text.h"
#include "estimate/floor_fit.h"
#include "jobs/grade_output.h"
#include "jobs/resources.h"
#include "physics/band_law.h"
#include "physics/spectral_law.h"

namespace foreglow {
namespace {

constexpr int usual_terms = 3;

// The channels' geometric mean.
Frequency reference_of(const GradeSource& source) {
    double sum = 0;
    for (const GradeChannel& channel : source.channels)
        sum += std::log(channel.channel.reference.hz());
    return Frequency::from_hz(std::exp(sum / static_cast<double>(source.channels.size())));
}

int read_terms(const GradeOptions& options, std::size_t channels) {
    const int most = static_cast<int>(channels) - 1;
    if (most < 1)
        throw InputError(options.source.string() +
                         " has one channel, and a smooth fit needs at least two: nothing would be left");
    if (!options.terms) return std::min(usual_terms, most);
    const std::string text = to_lower(trim(*options.terms));
    int terms = 0;
    if (text == "amplitude")
        terms = 1;
    else if (text == "amplitude+index")
        terms = 2;
    else if (text == "amplitude+index+curvature")
        terms = 3;
    else if (!text.empty() && text.size() < 4 &&
             std::all_of(text.begin(), text.end(), [](char c) { return c >= '0' && c <= '9'; }))
        terms = std::stoi(text);
    if (terms < 1)
        throw InputError("--terms " + *options.terms +
                         ": use a whole number from 1, or amplitude, amplitude+index, "
                         "amplitude+index+curvature");
    if (terms > most)
        throw InputError("--terms " + *options.terms + ": " + std::to_string(terms) + " terms go through " +
                         std::to_string(channels) + " channels exactly: ask for at most " +
                         std::to_string(most));
    return terms;
}

FloorSetup make_setup(const GradeOptions& options, const GradeSource& source) {
    const Frequency reference = reference_of(source);
    FloorSetup setup;
    setup.in_log = !options.linear;
    for (const GradeChannel& channel : source.channels) {
        setup.log_ratios.push_back(log_frequency_ratio(channel.channel.reference, reference));
        setup.responses.push_back(exact_band_value(channel.channel.band, reference, options.tilt, 0));
        if (channel.noise) setup.noise.push_back(*channel.noise);
    }
    return setup;
}

void check_room(const GradeOptions& options, const GradeSource& source, const HealpixGrid& grid) {
    const auto wanted = static_cast<std::int64_t>(source.channels.size()) * grid.npix() * 2 * 8;
    const std::int64_t free = available_resources(options.source).memory_bytes;
    if (wanted > free)
        throw InputError("grading " + std::to_string(source.channels.size()) + " channels of nside " +
                         std::to_string(grid.nside()) + " wants " +
                         format_bytes(static_cast<std::uint64_t>(wanted)) + " of memory and " +
                         format_bytes(static_cast<std::uint64_t>(free)) +
                         " are free: grade on a coarser grid with --nside");
}

std::vector<std::vector<double>> read_maps(const GradeOptions& options, const GradeSource& source,
                                           const HealpixGrid& grid, Progress& progress) {
    std::vector<std::vector<double>> maps;
    maps.reserve(source.channels.size());
    progress.begin("reading the channels", static_cast<std::int64_t>(source.channels.size()));
    for (std::size_t c = 0; c < source.channels.size(); ++c) {
        maps.push_back(read_grade_channel(source, options, c, grid));
        progress.step(static_cast<std::int64_t>(c) + 1);
    }
    progress.end();
    return maps;
}

std::string describe_left_out(const FloorCounts& counts) {
    std::string text;
    if (counts.undefined > 0) text = std::to_string(counts.undefined) + " are undefined in a channel";
    if (counts.not_positive > 0)
        text += (text.empty() ? "" : ", ") + std::to_string(counts.not_positive) +
                " are not positive in a channel, where a logarithm has no value (--fit linear takes them)";
    return text;
}

/// Rows, residual maps and spectra of the floor.
class FloorGrade {
  public:
    FloorGrade(const GradeOptions& options, const GradeSource& source, GradeOutput& output,
               Progress& progress)
        : options_(options),
          source_(source),
          output_(output),
          progress_(progress),
          grid_(options.nside.value_or(source.study.nside)),
          setup_(make_setup(options, source)) {}

    ResultRows run() {
        const int terms = read_terms(options_, source_.channels.size());
        check_room(options_, source_, grid_);
        if (options_.mask)
            selection_ = read_grade_mask(*options_.mask, grid_, source_.study.frame, progress_);
        maps_ = read_maps(options_, source_, grid_, progress_);
        residuals_.assign(maps_.size(), std::vector<double>(maps_[0].size()));
        progress_.begin("fitting", terms);
        for (setup_.terms = 1; setup_.terms <= terms; ++setup_.terms) {
            const FloorCounts counts = make_floor_residuals(setup_, maps_, residuals_);
            if (setup_.terms == 1) check_counts(counts);
            add_rows();
            if (setup_.terms == terms) keep_residuals();
            progress_.step(setup_.terms);
        }
        progress_.end();
        return std::move(rows_);
    }

  private:
    void check_counts(const FloorCounts& counts) const {
        const std::string left_out = describe_left_out(counts);
        if (counts.fitted == 0)
            throw InputError("no pixel of " + options_.source.string() + " can be fitted: of " +
                             std::to_string(grid_.npix()) + ", " + left_out);
        if (!left_out.empty()) progress_.notice("of " + std::to_string(grid_.npix()) + " pixels " + left_out);
    }

    void add_rows() {
        const std::string unit = to_text(source_.study.unit);
        std::vector<ResidualStatistics> statistics(maps_.size());
        parallel_for_blocks(static_cast<std::int64_t>(maps_.size()), 1,
                            [&](std::int64_t begin, std::int64_t) {
                                const auto c = static_cast<std::size_t>(begin);
                                statistics[c] = make_residual_statistics(residuals_[c], selection_);
                            });
        for (std::size_t c = 0; c < maps_.size(); ++c) {
            const ResidualStatistics& s = statistics[c];
            // What the reference power law has in K_RJ at the frequency, for one of the channel's own units.
            const double kelvin = std::exp(options_.tilt * setup_.log_ratios[c]) / setup_.responses[c];
            rows_.add({source_.channels[c].channel.name, source_.channels[c].channel.reference.hz(),
                       setup_.terms, s.rms, s.mean, s.p95_of_size, unit, s.pixels, s.rms * kelvin});
        }
    }

    void keep_residuals() {
        if (!output_.is_kept()) return;
        const std::string unit = to_text(source_.study.unit);
        const MaskedSpectra spectra(grid_, std::min(source_.study.lmax, 2 * grid_.nside()));
        for (std::size_t c = 0; c < maps_.size(); ++c) {
            const Channel& channel = source_.channels[c].channel;
            output_.write_residual(
                channel.name, grid_, "RESIDUAL", unit, residuals_[c],
                {{"FREQ", channel.reference.hz(), "[Hz] reference frequency"},
                 {"TERMS", static_cast<std::int64_t>(setup_.terms), "of the smooth fit across channels"},
                 {"FIT", std::string(options_.linear ? "linear" : "log"), "what is a polynomial in ln nu"},
                 {"TILT", options_.tilt, "index of the reference power law"}});
            PixelSelection fitted = selection_;
            if (fitted.empty()) fitted.assign(maps_[c].size(), 1);
            for (std::size_t p = 0; p < fitted.size(); ++p)
                if (!is_defined(residuals_[c][p])) fitted[p] = 0;
            output_.add_spectrum(channel.name, "I_STOKES", 0, spectra.of(residuals_[c], fitted),
                                 spectra.of(maps_[c], fitted));
        }
    }

    const GradeOptions& options_;
    const GradeSource& source_;
    GradeOutput& output_;
    Progress& progress_;
    HealpixGrid grid_;
    FloorSetup setup_;
    PixelSelection selection_;
    std::vector<std::vector<double>> maps_, residuals_;
    ResultRows rows_{
        {"channel", "frequency_Hz", "terms", "rms", "mean", "p95", "unit", "pixels", "rms_K_RJ"}};
};

}  // namespace

GradeSummary run_grade(const GradeOptions& options, Progress& progress) {
    const GradeSource source = open_grade_source(options, progress);
    GradeOutput output(options, source);
    const bool floor = options.recovered.empty();
    const ResultRows rows = floor ? FloorGrade(options, source, output, progress).run()
                                  : grade_recovered(options, source, output, progress);
    output.finish(rows, floor ? "floor of a smooth fit across channels" : "recovered minus truth", progress);
    return {rows.text(options.format)};
}

}  // namespace foreglow
