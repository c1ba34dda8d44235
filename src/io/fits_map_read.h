// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <optional>
#include <string>
#include <variant>
#include <vector>

#include "io/fits_card.h"
#include "sphere/frame.h"
#include "sphere/grid.h"

namespace foreglow {

/// Names a HEALPix FITS map, and says what the file itself may leave open.
struct FitsMapRequest {
    std::filesystem::path path;
    std::string place;    ///< FILE:LINE:COLUMN of the key that names the map, or ""
    std::string section;  ///< table of the model file, for advice: add `unit = "K_RJ"` to [intensity]; or ""
    std::vector<std::variant<int, std::string>>
        columns;             ///< number in the file (from 1) or TTYPE, in any case; none: the first
    std::optional<int> hdu;  ///< 0 is the primary HDU, 1 the first extension; none: the first HEALPix table
    std::optional<Ordering> ordering;
    std::optional<Frame> frame;
};

struct FitsMapColumnInfo {
    int number = 0;                    ///< from 1, in the file
    std::string name;                  ///< TTYPE
    std::string unit;                  ///< TUNIT; "" where absent or 'unknown'
    std::string format;                ///< TFORM
    bool holds_pixel_numbers = false;  ///< the PIXEL column of explicit indexing
};

/// Holds what a map's header says; nothing is guessed, and what it does not say is absent.
struct FitsMapHeader {
    std::filesystem::path path;
    int hdu = 0;  ///< 1 is the first extension
    HealpixGrid grid{1};
    std::optional<Ordering> ordering;                  ///< as the file says, else as the request says
    std::optional<Frame> frame;                        ///< likewise (COORDSYS)
    std::optional<PolarizationConvention> convention;  ///< POLCCONV
    bool partial = false;                              ///< explicit indexing
    std::int64_t listed = 0;                           ///< pixels in the file; npix unless partial
    std::vector<FitsMapColumnInfo> columns;            ///< all of the table's
    std::vector<int> requested;        ///< numbers of the requested columns, in the request's order
    std::vector<FitsCard> cards;       ///< all of the table's header, in order
    std::vector<std::string> notices;  ///< one line each, to be shown to the user

    /// Returns the first card of that keyword, or null.
    [[nodiscard]] const FitsCard* find(const std::string& key) const;
    /// Returns a card's number, be it written as an integer or a real one.
    [[nodiscard]] std::optional<double> number(const std::string& key) const;
    /// Returns a card's text without blanks at its ends.
    [[nodiscard]] std::optional<std::string> text(const std::string& key) const;
};

struct FitsMapColumn {
    std::string name;
    std::string unit;            ///< TUNIT; "" where absent or 'unknown'
    std::vector<double> values;  ///< [npix], RING order, NaN where undefined
};

/// Holds the requested columns of a map.
struct FitsMap {
    HealpixGrid grid{1};
    Ordering file_ordering = Ordering::Ring;
    std::optional<Frame> frame;                        ///< COORDSYS, else as the request says
    std::optional<PolarizationConvention> convention;  ///< POLCCONV
    std::vector<FitsMapColumn> columns;
    std::int64_t undefined = 0;  ///< pixels undefined in one of the columns or not in the file
    bool partial = false;
    std::vector<std::string> notices;  ///< one line each, to be shown to the user
};

/// Holds the pixels that a coverage file wants.
struct CoverageMap {
    HealpixGrid grid{1};
    std::optional<Frame> frame;
    std::vector<std::int64_t> pixels;  ///< RING numbers, ascending
    std::vector<std::string> notices;
};

/// Reads a map's header without its pixels; a missing ORDERING is left open.
///
/// Checked before anything else is read: the nside, that rows times cells make 12 nside^2 pixels, and that
/// the file is as long as its header says (Gorski et al. 2005; HEALPix FITS convention; FITS 4.0).
/// @throws InputError where the file does not exist, a requested column or HDU is not there, or the request
/// contradicts the header
/// @throws DataError where the file is no FITS file, holds no HEALPix map, or its header is inconsistent;
/// FileError on I/O
[[nodiscard]] FitsMapHeader read_fits_map_header(const FitsMapRequest& request);

/// Reads the requested columns, scaled (TSCAL, TZERO), in RING order, as double; with threads.
///
/// Undefined, thus NaN: BAD_DATA and -1.6375e30 (both to a relative 1e-5), NaN, infinities, TNULL, pixels
/// that are not in the file.
/// @throws InputError as above, and where neither the file nor the request gives the ordering
/// @throws DataError as above, and where pixel numbers are out of range or repeated; FileError on I/O
[[nodiscard]] FitsMap read_fits_map(const FitsMapRequest& request);

/// Reads which pixels a map wants: those that are defined and not zero; a file of pixel numbers alone wants
/// all of them.
/// @throws as read_fits_map
[[nodiscard]] CoverageMap read_coverage(const FitsMapRequest& request);

/// Returns the start of a message about a request: "model.toml:3:7: ", or "".
[[nodiscard]] std::string message_place(const FitsMapRequest& request);

/// Returns advice to add a key: "add `unit = ...` to [intensity]", or "add `unit = ...`" where the section is
/// not known.
[[nodiscard]] std::string advice_to_add(const FitsMapRequest& request, const std::string& key_and_value);

}  // namespace foreglow
