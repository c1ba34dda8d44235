// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

namespace foreglow {

/// The value that stands for "no one measured this pixel" in HEALPix files (the HEALPix convention's UNSEEN
/// and BAD_DATA).
inline constexpr double fits_bad_data = -1.6375e30;

/// How far from the sentinel a value may be and still be it: float32 files hold it to 6e-8, text-made ones to
/// four digits.
inline constexpr double fits_bad_data_tolerance = 1e-5;

}  // namespace foreglow
