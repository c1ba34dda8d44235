// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "base/quantity.h"
#include "model/study_spec.h"
#include "physics/response.h"
#include "sphere/beam.h"

namespace foreglow {

/// One channel, its files read: what it does to a spectrum and to a_lm.
struct Channel {
    std::string name;
    Frequency reference;                 ///< the FREQ card
    std::optional<Frequency> bandwidth;  ///< full width of the response; nothing for a single frequency
    BandSum band;                        ///< in the study's unit
    std::optional<BeamWindow> beam;      ///< up to the study's lmax
    std::optional<Angle> beam_fwhm;      ///< where the beam is Gaussian
    /// What the band was made from; nothing where a band was given outright.
    std::optional<Response> response;
    ResponseWeights response_weights = ResponseWeights::Temperature;
    Calibration calibration;
};

/// Makes a channel's band with nodes close enough for what turns with lambda^2 inside it.
[[nodiscard]] BandSum refine_band(const Channel& channel, const BandRefinement& refinement);

/// Reads responses and beam windows and makes the channels of a study.
/// @throws InputError or DataError with the place where a file is missing, broken, or shorter than lmax
[[nodiscard]] std::vector<Channel> make_channels(const StudySpec& study);

/// Tells whether a channel's map can be made pixel by pixel: no beam, no pixel window, no rotation to another
/// frame.
[[nodiscard]] bool is_made_per_pixel(const Channel& channel, const StudySpec& study, Frame sky_frame);

}  // namespace foreglow
