// SPDX-License-Identifier: GPL-2.0-or-later
#include <algorithm>
#include <cmath>
#include <string>

#include "base/error.h"
#include "base/text.h"
#include "model/study_channels.h"
#include "model/typed_keys.h"

namespace foreglow {
namespace {

enum class Spacing { Linear, Log };
enum class BeamScaling { Fixed, Diffraction };

struct GridKeys {
    std::string name;
    double first = 0, last = 0;  ///< [Hz]
    std::int64_t count = 0;
    Spacing spacing = Spacing::Linear;
    bool is_contiguous = false;
    std::optional<Frequency> bandwidth;
    std::optional<Angle> beam_fwhm;
    std::optional<Frequency> beam_at;
    BeamScaling beam_scaling = BeamScaling::Fixed;
    std::optional<std::string> noise;
};

/// Returns the grid's frequency at a possibly fractional step; the ends come out exactly as written.
double frequency_at(const GridKeys& grid, double step) {
    if (grid.count == 1 || step == 0) return grid.first;
    const double t = step / static_cast<double>(grid.count - 1);
    if (t == 1) return grid.last;
    if (grid.spacing == Spacing::Log) return grid.first * std::pow(grid.last / grid.first, t);
    return grid.first + t * (grid.last - grid.first);
}

void check_frequencies(const TomlReader& reader, const GridKeys& grid) {
    if (grid.count == 1 && grid.first != grid.last)
        reader.fail("count",
                    "is 1, which needs 'first' and 'last' to be the same: raise count or make them equal");
    if (grid.count > 1 && !(grid.first < grid.last))
        reader.fail("last", "must lie above 'first' where count is more than 1");
    if (!grid.is_contiguous && grid.bandwidth && grid.bandwidth->hz() >= 2 * grid.first)
        reader.fail("bandwidth", "reaches down to zero frequency at " +
                                     to_text(Frequency::from_hz(grid.first)) + ": make it narrower than " +
                                     to_text(Frequency::from_hz(2 * grid.first)));
    if (!grid.is_contiguous) return;
    if (grid.count == 1)
        reader.fail("bandwidth",
                    "cannot be \"contiguous\" where count is 1: give a width such as \"0.5 MHz\"");
    if (!(frequency_at(grid, -0.5) > 0))
        reader.fail(
            "bandwidth",
            "as \"contiguous\" puts the lowest band's edge below zero frequency: raise count or 'first'");
}

void check_beam(const TomlReader& reader, const GridKeys& grid, bool has_scaling) {
    if (!grid.beam_fwhm && (grid.beam_at || has_scaling))
        reader.fail(grid.beam_at ? "beam_at" : "beam_scaling",
                    "needs a beam: add a line such as beam_fwhm = \"2 deg\"");
    if (grid.beam_scaling != BeamScaling::Diffraction) return;
    if (!grid.beam_at) reader.fail_missing("beam_at", "beam_at = \"100 MHz\", where beam_fwhm holds");
    if (grid.beam_fwhm->degrees() * grid.beam_at->hz() / grid.first > 180 * (1 + 1e-12))
        reader.fail("beam_fwhm", "grows above 180 deg at " + to_text(Frequency::from_hz(grid.first)) +
                                     ": make it smaller");
}

/// Reads `bandwidth`, a frequency or "contiguous".
void read_bandwidth(TomlReader& reader, GridKeys& grid) {
    const auto text = reader.text("bandwidth", "bandwidth = \"0.5 MHz\"");
    if (!text) return;
    if (to_lower(trim(*text)) == "contiguous")
        grid.is_contiguous = true;
    else if (trim(*text).find_first_of("0123456789") == std::string::npos)
        reader.fail("bandwidth",
                    "must be a frequency such as \"0.5 MHz\" or \"contiguous\", but is '" + *text + "'");
    else
        grid.bandwidth = read_frequency(reader, "bandwidth");
}

GridKeys read_keys(TomlReader& reader) {
    GridKeys grid;
    grid.name = read_channel_name(reader).value_or("grid");
    const auto first = read_frequency(reader, "first");
    const auto last = read_frequency(reader, "last");
    const auto count = read_integer(reader, "count", 1, 100000, "count = 256");
    grid.spacing =
        read_choice<Spacing>(reader, "spacing", {{"linear", Spacing::Linear}, {"log", Spacing::Log}})
            .value_or(Spacing::Linear);
    read_bandwidth(reader, grid);
    grid.beam_fwhm = read_beam_fwhm(reader, "beam_fwhm");
    grid.beam_at = read_frequency(reader, "beam_at");
    const auto scaling = read_choice<BeamScaling>(
        reader, "beam_scaling", {{"diffraction", BeamScaling::Diffraction}, {"fixed", BeamScaling::Fixed}});
    // A frequency at which the beam holds has a meaning only where the beam changes with frequency.
    grid.beam_scaling = scaling.value_or(grid.beam_at ? BeamScaling::Diffraction : BeamScaling::Fixed);
    grid.noise = read_channel_noise(reader);
    (void)read_response_keys(reader, {});
    reader.check_no_other_keys();
    if (!first) reader.fail_missing("first", "first = \"50 MHz\"");
    if (!last) reader.fail_missing("last", "last = \"200 MHz\"");
    if (!count) reader.fail_missing("count", "count = 256");
    grid.first = first->hz();
    grid.last = last->hz();
    grid.count = *count;
    check_frequencies(reader, grid);
    check_beam(reader, grid, scaling.has_value());
    return grid;
}

std::string make_name(const GridKeys& grid, std::int64_t i) {
    const std::string number = std::to_string(i);
    const std::size_t width = std::max<std::size_t>(4, std::to_string(grid.count - 1).size());
    return grid.name + "_" + std::string(width - number.size(), '0') + number;
}

}  // namespace

std::vector<ChannelSpec> read_channel_grid(TomlReader reader, const ChannelDefaults& defaults) {
    const GridKeys grid = read_keys(reader);
    const ChannelDefaults own = read_response_keys(reader, defaults);
    std::vector<ChannelSpec> channels;
    for (std::int64_t i = 0; i < grid.count; ++i) {
        const auto step = static_cast<double>(i);
        ChannelSpec channel;
        channel.name = make_name(grid, i);
        channel.place = reader.place();
        channel.frequency = Frequency::from_hz(frequency_at(grid, step));
        channel.bandwidth = grid.bandwidth;
        if (grid.is_contiguous) {
            channel.band_low = Frequency::from_hz(frequency_at(grid, step - 0.5));
            channel.band_high = Frequency::from_hz(frequency_at(grid, step + 0.5));
            channel.bandwidth = Frequency::from_hz(channel.band_high->hz() - channel.band_low->hz());
        }
        channel.beam_fwhm = grid.beam_fwhm;
        if (grid.beam_scaling == BeamScaling::Diffraction)
            channel.beam_fwhm = Angle::from_radians(grid.beam_fwhm->radians() *
                                                    (grid.beam_at->hz() / channel.frequency->hz()));
        channel.noise = grid.noise;
        channel.response_weights = own.response_weights;
        channel.reference_flux_index = own.reference_flux_index;
        channels.push_back(std::move(channel));
    }
    return channels;
}

}  // namespace foreglow
