// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <span>
#include <vector>

#include "io/fits_card.h"

namespace foreglow {

/// Describes a FITS image before its values are there.
struct FitsImageLayout {
    std::vector<std::int64_t> axes;  ///< NAXIS1, NAXIS2, ...
    bool float64 = false;            ///< else float32, each value rounded once
    std::vector<FitsCard> cards;     ///< in this order: WCS, units, origin
};

/// Returns the length of the file that this layout makes, about [bytes].
[[nodiscard]] std::int64_t fits_image_file_bytes(const FitsImageLayout& layout);

/// Writes values as the primary image of a FITS file (FITS 4.0, Pence et al. 2010), first axis running
/// fastest, through AtomicFile; CHECKSUM and DATASUM; NaN stays NaN; no DATE: equal calls give equal bytes.
/// @param values  [product of axes]
/// @throws FileError with the system's reason
void write_fits_image(const std::filesystem::path& path, const FitsImageLayout& layout,
                      std::span<const double> values);

}  // namespace foreglow
