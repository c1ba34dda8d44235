// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <vector>

#include "base/quantity.h"

namespace foreglow {

/// A tabulated transmission tau(nu): linear between rows, zero outside them; equal neighbouring frequencies
/// are a step.
struct ResponseTable {
    std::filesystem::path file;
    std::vector<Frequency> frequencies;  ///< [rows], non-decreasing, at most two equal ones in a row
    std::vector<double> transmission;    ///< [rows], >= 0, with an integral above zero
};

/// Reads a response file: a header such as frequency_GHz,transmission (Hz, kHz, MHz, GHz, THz), then at least
/// two rows.
/// @throws InputError where it does not exist; DataError "FILE:LINE: ..." where its content is wrong
[[nodiscard]] ResponseTable read_response_file(const std::filesystem::path& path);

/// A tabulated beam: B_l for l = 0..lmax.
struct BeamTable {
    std::filesystem::path file;
    int lmax = 0;
    std::vector<double> intensity;  ///< [lmax + 1]
    std::vector<double>
        polarization;  ///< [lmax + 1], of E and B; the intensity's where the file has no column of its own
    bool has_polarization_column = false;
};

/// Reads a beam window: the header l,B_l or l,B_l,B_l_pol, then a row for each l = 0, 1, 2, ...
/// @throws InputError where it does not exist; DataError "FILE:LINE: ..." where its content is wrong
[[nodiscard]] BeamTable read_beam_window(const std::filesystem::path& path);

}  // namespace foreglow
