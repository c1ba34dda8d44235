// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/point_map.h"

#include <array>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/parallel.h"
#include "model/map_source.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 8192;

}  // namespace

PointMap::PointMap(const MapSource& source, std::size_t columns, std::vector<std::string>& notices) {
    FitsMapRequest request = make_request(source);
    if (request.columns.empty() && columns == 1) request.columns = {1};
    reader_ = std::make_shared<const FitsPixelReader>(request);
    FOREGLOW_EXPECTS(reader_->header().requested.size() == columns);
    frame_ = resolve_frame(source, reader_->header().frame);
    notices.insert(notices.end(), reader_->header().notices.begin(), reader_->header().notices.end());
}

const FitsMapColumnInfo& PointMap::column(std::size_t requested) const {
    const FitsMapHeader& header = reader_->header();
    return header.columns.at(static_cast<std::size_t>(header.requested.at(requested) - 1));
}

PointMap PointMap::open_plain(const MapSource& source, std::vector<std::string>& notices) {
    return {source, 1, notices};
}

PointMap PointMap::open_brightness(const MapSource& source, Frequency frequency,
                                   const std::optional<Brightness>& zero_level,
                                   std::vector<std::string>& notices) {
    PointMap map(source, 1, notices);
    const double area = map.grid().pixel_area();
    map.factor_ = rayleigh_jeans_per_unit(resolve_unit(source, map.column(0).unit), frequency, area);
    if (zero_level)
        map.zero_level_ = zero_level->value * rayleigh_jeans_per_unit(zero_level->unit, frequency, area);
    return map;
}

PointMap PointMap::open_stokes(const MapSource& source, Frequency frequency,
                               std::vector<std::string>& notices) {
    PointMap map(source, 2, notices);
    const double area = map.grid().pixel_area();
    map.factor_ = rayleigh_jeans_per_unit(resolve_unit(source, map.column(0).unit), frequency, area);
    map.second_factor_ = rayleigh_jeans_per_unit(resolve_unit(source, map.column(1).unit), frequency, area);
    map.negate_u_ =
        resolve_convention(source, map.reader_->header().convention) == PolarizationConvention::Iau;
    return map;
}

PointMap PointMap::open_angles(const MapSource& source, std::vector<std::string>& notices) {
    PointMap map(source, 1, notices);
    map.negate_u_ =
        resolve_convention(source, map.reader_->header().convention) == PolarizationConvention::Iau;
    map.holds_angles_ = true;
    return map;
}

void PointMap::read(std::span<const std::int64_t> pixels, std::span<double> out) const {
    const std::array<std::span<double>, 1> columns{out};
    reader_->read(pixels, columns);
    if (factor_ == 1 && zero_level_ == 0) return;
    for (double& value : out)
        value = value * factor_ - zero_level_;
}

void PointMap::read_stokes(std::span<const std::int64_t> pixels, std::span<double> q,
                           std::span<double> u) const {
    const double sign = negate_u_ ? -1.0 : 1.0;
    const auto count = static_cast<std::int64_t>(pixels.size());
    if (holds_angles_) {
        const std::array<std::span<double>, 1> columns{q};
        reader_->read(pixels, columns);
        parallel_for_blocks(count, block, [&](std::int64_t begin, std::int64_t end) {
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i) {
                const double twice = 2 * q[i] * constants::pi / 180;
                q[i] = std::cos(twice);
                u[i] = sign * std::sin(twice);
            }
        });
        return;
    }
    const std::array<std::span<double>, 2> columns{q, u};
    reader_->read(pixels, columns);
    for (std::size_t i = 0; i < q.size(); ++i) {
        q[i] *= factor_;
        u[i] *= sign * second_factor_;
        if (!is_defined(q[i]) || !is_defined(u[i])) q[i] = u[i] = undefined_pixel;
    }
}

}  // namespace foreglow
