// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/map_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <numeric>

#include "base/error.h"
#include "io/fits_map_read.h"
#include "support/messages.h"
#include "support/sky_builder.h"

namespace foreglow {
namespace {

using testing::fits_map;
using testing::has;
using testing::message_of;

class MapFiles : public ::testing::Test {
  protected:
    StudySpec study(bool polarized = true) const {
        StudySpec spec = testing::study_spec(4, {testing::channel_spec("a", 30)}, polarized);
        spec.precision = MapPrecision::Float64;
        return spec;
    }
    // Writes value p + 1000 c in pixel p of column c, in pieces of odd sizes, and reads the file again.
    FitsMap write_and_read(const StudySpec& spec, const Coverage* coverage = nullptr) const {
        std::vector<FitsMapColumnName> names{{"I_STOKES", "uK_CMB"}};
        if (spec.polarized) names.insert(names.end(), {{"Q_STOKES", "uK_CMB"}, {"U_STOKES", "uK_CMB"}});
        MapFile file(folder_ / "map.fits", make_study_layout(spec, coverage, names, spec.polarized),
                     spec.polarized);
        for (std::int64_t first = 0; first < 192; first += 50) {
            const std::int64_t count = std::min<std::int64_t>(50, 192 - first);
            std::vector<std::vector<double>> values(names.size());
            std::vector<std::span<double>> columns;
            for (std::size_t c = 0; c < names.size(); ++c) {
                for (std::int64_t i = 0; i < count; ++i)
                    values[c].push_back(static_cast<double>(first + i) + 1000.0 * static_cast<double>(c));
                columns.emplace_back(values[c]);
            }
            file.write(first, columns);
        }
        file.finish();
        FitsMapRequest request;
        request.path = folder_ / "map.fits";
        for (const FitsMapColumnName& name : names)
            request.columns.emplace_back(name.name);
        return read_fits_map(request);
    }
    StudySpec with_coverage(const testing::FitsMapBuilder& map) const {
        map.write(folder_ / "cover.fits");
        StudySpec spec = study();
        spec.coverage = folder_ / "cover.fits";
        spec.coverage_place = "study.toml:9:1";
        return spec;
    }
    testing::TemporaryFolder folder_;
};

TEST_F(MapFiles, KeepEveryPixelInEitherOrderAndConvention) {
    for (const Ordering ordering : {Ordering::Ring, Ordering::Nested})
        for (const auto convention : {PolarizationConvention::Cosmo, PolarizationConvention::Iau}) {
            StudySpec spec = study();
            spec.ordering = ordering;
            spec.convention = convention;
            spec.frame = Frame::Ecliptic;
            const FitsMap map = write_and_read(spec);
            EXPECT_EQ(map.file_ordering, ordering);
            EXPECT_EQ(map.convention, convention);
            EXPECT_EQ(map.frame, Frame::Ecliptic);
            const double sign = convention == PolarizationConvention::Iau ? -1 : 1;
            for (std::size_t p = 0; p < 192; ++p) {
                const auto value = static_cast<double>(p);
                EXPECT_EQ(map.columns[0].values[p], value);
                EXPECT_EQ(map.columns[1].values[p], value + 1000);
                EXPECT_EQ(map.columns[2].values[p], sign * (value + 2000));
            }
        }
}

TEST_F(MapFiles, WithoutPolarizationNothingIsNegatedAndNoConventionWritten) {
    StudySpec spec = study(false);
    spec.convention = PolarizationConvention::Iau;
    const FitsMap map = write_and_read(spec);
    EXPECT_FALSE(map.convention.has_value());
    EXPECT_EQ(map.columns[0].values[77], 77.0);
}

TEST_F(MapFiles, ACoverageLimitsThePixelsInEitherOrder) {
    std::vector<double> wanted(192, 0.0);
    for (const std::size_t p : {3U, 50U, 51U, 190U})
        wanted[p] = 1;
    wanted[7] = std::nan("");
    for (const Ordering ordering : {Ordering::Ring, Ordering::Nested}) {
        StudySpec spec = with_coverage(fits_map(4, {wanted}));
        spec.ordering = ordering;
        const Coverage coverage = read_study_coverage(spec);
        EXPECT_EQ(coverage.ring_pixels, (std::vector<std::int64_t>{3, 50, 51, 190}));
        EXPECT_TRUE(std::is_sorted(coverage.file_pixels.begin(), coverage.file_pixels.end()));
        const FitsMap map = write_and_read(spec, &coverage);
        EXPECT_TRUE(map.partial);
        EXPECT_EQ(map.undefined, 188);
        for (std::size_t p = 0; p < 192; ++p) {
            EXPECT_EQ(is_defined(map.columns[0].values[p]), wanted[p] == 1);
            EXPECT_TRUE(wanted[p] != 1 || map.columns[2].values[p] == 2000 + static_cast<double>(p));
        }
    }
}

TEST_F(MapFiles, ACoverageMustFitTheStudy) {
    const auto message = [&](const StudySpec& spec) {
        return message_of<InputError>([&] { return read_study_coverage(spec); });
    };
    const std::string start = "study.toml:9:1: the coverage cover.fits ";
    EXPECT_TRUE(has(message(with_coverage(fits_map(2, {std::vector<double>(48, 1)}))),
                    start + "has nside 2 but the study has 4"));
    EXPECT_TRUE(
        has(message(with_coverage(fits_map(4, {std::vector<double>(192, 1)}).card("COORDSYS", "'C       '"))),
            start + "is in icrs but the study in galactic"));
    EXPECT_TRUE(
        has(message(with_coverage(fits_map(4, {std::vector<double>(192, 0)}))), start + "wants no pixel"));
}

TEST_F(MapFiles, TheLayoutSaysWhatTheStudySays) {
    StudySpec spec = study();
    spec.precision = MapPrecision::Float32;
    spec.ordering = Ordering::Nested;
    const FitsMapLayout layout = make_study_layout(spec, nullptr, {{"X", ""}}, false);
    EXPECT_EQ(layout.nside, 4);
    EXPECT_FALSE(layout.float64 || layout.convention || layout.pixels);
    EXPECT_EQ(layout.ordering, Ordering::Nested);
    EXPECT_TRUE(make_study_layout(study(), nullptr, {{"X", ""}}, true).float64);
}

}  // namespace
}  // namespace foreglow
