// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <string>

namespace foreglow {

/// Checks the cards of a header that say how long its HDU is, before CFITSIO builds anything on them.
///
/// NAXIS 0 to 999, each NAXISn, PCOUNT, GCOUNT and TFIELDS whole and not negative, and an END card.
/// (CFITSIO 4.2 goes on after it has found a negative NAXIS2, and asks for memory of a size that it never
/// set.)
/// @param descriptor  an open file
/// @param offset      where the header begins [bytes]; nothing is checked where no header begins
/// @param where       start of the messages: "map.fits, HDU 1: "
/// @throws DataError where a card is wrong; FileError on I/O
void check_fits_header(int descriptor, std::int64_t offset, const std::string& where);

}  // namespace foreglow
