// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/channel.h"

#include "base/error.h"
#include "model/response_file.h"

namespace foreglow {
namespace {

Response make_response(const ChannelSpec& spec) {
    if (spec.response) {
        const ResponseTable table = read_response_file(*spec.response);
        std::vector<ResponseRow> rows;
        for (std::size_t i = 0; i < table.frequencies.size(); ++i)
            rows.push_back({table.frequencies[i], table.transmission[i]});
        return Response::table(std::move(rows));
    }
    if (spec.band_low) return Response::flat(*spec.band_low, *spec.band_high);
    if (spec.bandwidth) {
        const double middle = spec.frequency->hz();
        const double half = 0.5 * spec.bandwidth->hz();
        return Response::flat(Frequency::from_hz(middle - half), Frequency::from_hz(middle + half));
    }
    return Response::at(*spec.frequency);
}

std::optional<BeamWindow> make_beam(const ChannelSpec& spec, int lmax) {
    if (spec.beam_fwhm) return make_gaussian_beam(*spec.beam_fwhm, lmax);
    if (!spec.beam_window) return std::nullopt;
    BeamTable table = read_beam_window(*spec.beam_window);
    if (table.lmax < lmax)
        throw InputError(spec.place + ": the beam window " + spec.beam_window->string() + " ends at l = " +
                         std::to_string(table.lmax) + " but the study's lmax is " + std::to_string(lmax) +
                         ": give more rows, or set `lmax = " + std::to_string(table.lmax) + "`");
    const auto rows = static_cast<std::size_t>(lmax) + 1;
    table.intensity.resize(rows);
    table.polarization.resize(rows);
    return make_tabulated_beam(std::move(table.intensity), std::move(table.polarization));
}

}  // namespace

std::vector<Channel> make_channels(const StudySpec& study) {
    const double area = HealpixGrid(study.nside).pixel_area();
    std::vector<Channel> channels;
    for (const ChannelSpec& spec : study.channels) {
        const Response response = make_response(spec);
        Channel channel;
        channel.name = spec.name;
        channel.reference = spec.frequency ? *spec.frequency : response.mean_frequency(spec.response_weights);
        if (!response.is_delta())
            channel.bandwidth = Frequency::from_hz(response.highest().hz() - response.lowest().hz());
        channel.response = response;
        channel.response_weights = spec.response_weights;
        channel.calibration = {study.unit, channel.reference, spec.reference_flux_index, area};
        channel.band = make_band_sum(response, channel.response_weights, channel.calibration);
        channel.beam = make_beam(spec, study.lmax);
        channel.beam_fwhm = spec.beam_fwhm;
        channels.push_back(std::move(channel));
    }
    return channels;
}

BandSum refine_band(const Channel& channel, const BandRefinement& refinement) {
    if (!channel.response) return channel.band;
    return make_band_sum(*channel.response, channel.response_weights, channel.calibration, &refinement);
}

bool is_made_per_pixel(const Channel& channel, const StudySpec& study, Frame sky_frame) {
    return !channel.beam && !study.pixel_window && study.frame == sky_frame;
}

}  // namespace foreglow
