// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_pixel_reader.h"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <cstdlib>
#include <numeric>

#include "base/error.h"
#include "support/fits_builder.h"
#include "support/messages.h"

namespace foreglow {
namespace {

using testing::FitsMapBuilder;
using testing::message_of;
using testing::TemporaryFolder;

constexpr int nside = 4;
constexpr std::size_t npix = 192;

std::vector<double> counted(double factor = 1) {
    std::vector<double> values(npix);
    for (std::size_t i = 0; i < npix; ++i)
        values[i] = factor * (static_cast<double>(i) - 40);
    return values;
}

// All pixels, some twice and not in order, so that both ways of reading are used.
std::vector<std::int64_t> many_pixels() {
    std::vector<std::int64_t> pixels(3 * npix);
    for (std::size_t i = 0; i < pixels.size(); ++i)
        pixels[i] = static_cast<std::int64_t>(i * 77 % npix);
    return pixels;
}

/// Holds what is read pixel by pixel, few and many at a time, against the reader of whole maps.
void expect_like_the_whole_map(const FitsMapRequest& request) {
    const FitsMap whole = read_fits_map(request);
    const FitsPixelReader reader(request);
    std::vector<std::int64_t> pixels = many_pixels();
    for (const std::size_t count : {pixels.size(), std::size_t{7}, std::size_t{1}}) {
        pixels.resize(count);
        std::vector<std::vector<double>> columns(whole.columns.size(), std::vector<double>(count));
        std::vector<std::span<double>> out(columns.begin(), columns.end());
        reader.read(pixels, out);
        for (std::size_t c = 0; c < columns.size(); ++c)
            for (std::size_t i = 0; i < count; ++i) {
                const double expected = whole.columns[c].values[static_cast<std::size_t>(pixels[i])];
                if (std::isnan(expected))
                    EXPECT_TRUE(std::isnan(columns[c][i])) << pixels[i];
                else
                    EXPECT_EQ(columns[c][i], expected) << pixels[i];
            }
    }
}

TEST(FitsPixelReader, ReadsWhatTheReaderOfWholeMapsReads) {
    const TemporaryFolder folder;
    std::vector<double> holes = counted(0.25);
    holes[3] = -1.6375e30;
    holes[150] = NAN;
    for (const char* ordering : {"'RING    '", "'NESTED  '"})
        for (const char* form : {"1E", "16E", "192D", "64J", "1I"}) {
            FitsMapBuilder builder(nside);
            builder.card("ORDERING", ordering)
                .column("FIRST", form, counted())
                .column("SECOND", std::string(form).substr(0, std::string(form).size() - 1) + "D", holes);
            if (form[std::string(form).size() - 1] == 'J')
                builder.card("TSCAL1", "0.5").card("TZERO1", "7.0").card("TNULL1", "-5");
            builder.write(folder / "map.fits");
            FitsMapRequest request;
            request.path = folder / "map.fits";
            request.columns = {2, 1};
            expect_like_the_whole_map(request);
        }
}

TEST(FitsPixelReader, FindsPixelsOfPartialMapsWhetherTheirNumbersAscendOrNot) {
    const TemporaryFolder folder;
    for (const std::size_t step : {std::size_t{1}, std::size_t{61}})  // 61 and 120 have no common factor
        for (const char* ordering : {"'RING    '", "'NESTED  '"}) {
            std::vector<double> numbers(120), values(120);
            for (std::size_t i = 0; i < numbers.size(); ++i) {
                numbers[i] = static_cast<double>(i * step % 120) + 30;
                values[i] = static_cast<double>(i) + 0.5;
            }
            FitsMapBuilder(nside)
                .card("ORDERING", ordering)
                .card("INDXSCHM", "'EXPLICIT'")
                .column("PIXEL", "1J", numbers)
                .column("VALUE", "1E", values)
                .write(folder / "part.fits");
            FitsMapRequest request;
            request.path = folder / "part.fits";
            expect_like_the_whole_map(request);
        }
}

TEST(FitsPixelReader, ReadsGzippedMaps) {
    const TemporaryFolder folder;
    FitsMapBuilder(nside).column("VALUE", "1E", counted()).write(folder / "map.fits");
    const std::string command = "gzip -f '" + (folder / "map.fits").string() + "'";
    ASSERT_EQ(std::system(command.c_str()),
              0);  // NOLINT(cert-env33-c, concurrency-mt-unsafe): a test's own file
    FitsMapRequest request;
    request.path = folder / "map.fits.gz";
    expect_like_the_whole_map(request);
}

TEST(FitsPixelReader, RefusesWhatTheHeaderLeavesOpenAndBrokenPixelNumbers) {
    const TemporaryFolder folder;
    FitsMapBuilder(nside).without("ORDERING").column("VALUE", "1E", counted()).write(folder / "open.fits");
    FitsMapRequest request;
    request.path = folder / "open.fits";
    EXPECT_NE(
        message_of<InputError>([&] { return FitsPixelReader(request).header().listed; }).find("ORDERING"),
        std::string::npos);
    FitsMapBuilder(nside)
        .card("INDXSCHM", "'EXPLICIT'")
        .column("PIXEL", "1J", {5, 9, 9, 11})
        .column("VALUE", "1E", {1, 2, 3, 4})
        .write(folder / "twice.fits");
    request.path = folder / "twice.fits";
    const FitsPixelReader reader(request);
    const std::int64_t absent = 7;
    double value = 0;
    const std::array<std::span<double>, 1> out{std::span(&value, 1)};
    const std::string message = message_of<DataError>([&] {
        reader.read({&absent, 1}, out);
        return 0;
    });
    EXPECT_NE(message.find("pixel 9 comes a second time"), std::string::npos) << message;
}

}  // namespace
}  // namespace foreglow
