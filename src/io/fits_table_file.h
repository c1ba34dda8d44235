// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "io/fits_card.h"
#include "io/fits_map_read.h"

namespace foreglow {

/// Describes how a column's cells stand in a table row.
struct FitsTableColumn {
    int number = 0;  ///< from 1
    std::string name, unit, format;
    char type = 'E';             ///< the letter of TFORM: L B I J K E D, or one that holds no single numbers
    std::int64_t repeat = 0;     ///< cells in a row
    std::int64_t offset = 0;     ///< of the first cell in a row [bytes]
    std::int64_t width = 0;      ///< of a cell [bytes]
    double scale = 1, zero = 0;  ///< TSCAL, TZERO
    std::optional<std::int64_t> null_value;  ///< TNULL, of integers
};

struct FitsTable {
    int hdu = 0;  ///< 1 is the first extension
    std::int64_t rows = 0, row_bytes = 0;
    std::vector<FitsTableColumn> columns;
    std::vector<FitsCard> cards;
};

/// Reads the bytes of one HEALPix table of a FITS file, plain or gzip'd.
class FitsTableFile {
  public:
    /// Opens the file and goes to the table that the request names, or to the first one with PIXTYPE =
    /// 'HEALPIX'.
    ///
    /// The file is found to be as long as the table's header says before anything of that size is taken.
    /// @throws InputError, DataError, FileError as read_fits_map_header
    explicit FitsTableFile(const FitsMapRequest& request);
    ~FitsTableFile();
    FitsTableFile(const FitsTableFile&) = delete;
    FitsTableFile& operator=(const FitsTableFile&) = delete;

    [[nodiscard]] const FitsTable& table() const;

    /// Reads table bytes from an offset after the table's start; several threads may read at once.
    /// @throws DataError, FileError where they cannot be read
    void read_bytes(std::int64_t offset, std::span<std::byte> out) const;

    /// Returns the table's bytes mapped into memory, for readers of many single cells; empty for a gzip'd
    /// file. The file must not become shorter meanwhile.
    /// @throws FileError where the system refuses
    [[nodiscard]] std::span<const std::byte> view() const;

  private:
    struct Impl;
    std::unique_ptr<Impl> impl_;
};

/// Returns the start of a message about a table's content: "map.fits, HDU 1: ".
[[nodiscard]] std::string message_table(const FitsMapRequest& request, int hdu);

}  // namespace foreglow
