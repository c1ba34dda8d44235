// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <string>

#include "io/fits_map_read.h"
#include "io/fits_table_file.h"

namespace foreglow {

/// Makes sense of a table's header as a HEALPix map's, and checks it against the request.
/// @throws InputError, DataError as read_fits_map_header
[[nodiscard]] FitsMapHeader make_fits_map_header(const FitsTable& table, const FitsMapRequest& request);

/// Returns the ordering, or asks for it.
/// @throws InputError where neither the file nor the request says
[[nodiscard]] Ordering required_ordering(const FitsMapHeader& header, const FitsMapRequest& request);

/// Reads a COORDSYS value: G, C, E, also spelled out; nothing for other texts, as 'unknown'.
[[nodiscard]] std::optional<Frame> read_frame_card(const std::string& text);

}  // namespace foreglow
