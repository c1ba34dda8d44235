// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "io/fits_pixel_reader.h"
#include "model/model_spec.h"

namespace foreglow {

/// A map of a model of which only the pixels that are asked for are read; values are those that
/// model/map_source reads: K_RJ or pure numbers, COSMO, NaN where undefined.
class PointMap {
  public:
    /// Opens a map of one number per pixel that has no unit.
    /// @throws InputError, DataError, FileError as read_plain_map, as all of these; notices are appended
    [[nodiscard]] static PointMap open_plain(const MapSource& source, std::vector<std::string>& notices);
    /// Opens a brightness map at a frequency; the zero level is subtracted.
    [[nodiscard]] static PointMap open_brightness(const MapSource& source, Frequency frequency,
                                                  const std::optional<Brightness>& zero_level,
                                                  std::vector<std::string>& notices);
    /// Opens the two columns Q and U at a frequency.
    [[nodiscard]] static PointMap open_stokes(const MapSource& source, Frequency frequency,
                                              std::vector<std::string>& notices);
    /// Opens a map of polarization angles [deg], read as cos 2 chi and sin 2 chi.
    [[nodiscard]] static PointMap open_angles(const MapSource& source, std::vector<std::string>& notices);

    [[nodiscard]] const HealpixGrid& grid() const { return reader_->header().grid; }
    [[nodiscard]] Frame frame() const { return frame_; }

    /// Writes the values at RING pixels of the map's own grid, [n].
    void read(std::span<const std::int64_t> pixels, std::span<double> out) const;
    void read_stokes(std::span<const std::int64_t> pixels, std::span<double> q, std::span<double> u) const;

  private:
    PointMap(const MapSource& source, std::size_t columns, std::vector<std::string>& notices);
    [[nodiscard]] const FitsMapColumnInfo& column(std::size_t requested) const;

    std::shared_ptr<const FitsPixelReader> reader_;
    Frame frame_ = Frame::Galactic;
    double factor_ = 1, second_factor_ = 1;  ///< K_RJ per unit of the file
    double zero_level_ = 0;                  ///< K_RJ
    bool negate_u_ = false;
    bool holds_angles_ = false;
};

}  // namespace foreglow
