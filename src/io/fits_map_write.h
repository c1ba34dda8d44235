// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "io/fits_card.h"
#include "sphere/frame.h"
#include "sphere/grid.h"

namespace foreglow {

struct FitsMapColumnName {
    std::string name;  ///< TTYPEn; characters other than letters, digits and '_' become '_'
    std::string unit;  ///< TUNITn, verbatim; "" writes none
};

/// Describes a HEALPix FITS map before its values are there.
struct FitsMapLayout {
    int nside = 1;
    Ordering ordering = Ordering::Ring;
    Frame frame = Frame::Galactic;
    std::optional<PolarizationConvention> convention;  ///< where there: POLCCONV and POLAR = T
    std::vector<FitsMapColumnName> columns;            ///< at least one
    bool float64 = false;                              ///< else float32, each value rounded once
    /// Where there, a partial-sky file (explicit indexing) of just these pixels: numbers in the file's
    /// ordering, ascending.
    std::optional<std::vector<std::int64_t>> pixels;
    std::string extname;          ///< EXTNAME; "" writes none
    std::vector<FitsCard> cards;  ///< further cards, in this order
};

/// Returns the length of the file that this layout makes [bytes].
[[nodiscard]] std::int64_t fits_map_file_bytes(const FitsMapLayout& layout);

/// Writes a HEALPix FITS map piece by piece, from several threads if wanted; equal calls give equal bytes in
/// any order of pieces.
///
/// The file is one binary table as FITS 4.0 (Pence et al. 2010) and the HEALPix convention describe, with
/// CHECKSUM and DATASUM (Seaman et al.); it is built as NAME.part and renamed by finish(). NaN is written as
/// BAD_DATA = -1.6375e30. A DATE card appears only when SOURCE_DATE_EPOCH is set. Each pixel must be written
/// once.
class FitsMapWriter {
  public:
    using Columns = std::span<const std::span<const double>>;      ///< [columns][pixels]
    using FloatColumns = std::span<const std::span<const float>>;  ///< [columns][pixels]

    /// Creates NAME.part with its full length.
    /// @throws FileError with the system's reason; InputError where SOURCE_DATE_EPOCH is no number
    FitsMapWriter(const std::filesystem::path& path, const FitsMapLayout& layout);
    ~FitsMapWriter();
    FitsMapWriter(FitsMapWriter&&) noexcept;
    FitsMapWriter& operator=(FitsMapWriter&&) noexcept;

    /// Writes the pixels first, first + 1, ... of the full sky in the file's ordering; a partial-sky file
    /// keeps those it lists. Threads may write disjoint ranges at once.
    /// @throws FileError with the system's reason; NumericError where a value is infinite or too large for
    /// the precision
    void write_pixels(std::int64_t first, Columns columns);
    void write_pixels(std::int64_t first, FloatColumns columns);

    /// Writes pixels in any order: file_pixels [n] in the file's ordering, columns [columns][n]; a
    /// partial-sky file keeps those it lists. Threads may write disjoint sets at once. Takes the whole file's
    /// disk space at the first call.
    /// @throws FileError, NumericError as write_pixels
    void write_pixels_scattered(std::span<const std::int64_t> file_pixels, Columns columns);
    void write_pixels_scattered(std::span<const std::int64_t> file_pixels, FloatColumns columns);

    /// Puts the sums into the header, syncs and renames. All pixels must have been written.
    /// @throws FileError with the system's reason
    void finish();

  private:
    struct Impl;
    std::unique_ptr<Impl> impl_;
};

/// Writes a map at one go, with threads: columns [columns][npix], full sky in RING order whatever the file's
/// ordering.
/// @throws FileError, NumericError as FitsMapWriter
void write_fits_map(const std::filesystem::path& path, const FitsMapLayout& layout,
                    FitsMapWriter::Columns columns);

}  // namespace foreglow
