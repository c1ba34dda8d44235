// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/point_sky.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "model/load_sky.h"
#include "model/model_file.h"
#include "support/messages.h"
#include "support/sky_builder.h"

namespace foreglow {
namespace {

using namespace testing;

/// Writes the test sky's maps, each at its own nside, some with holes.
void write_maps(const TemporaryFolder& folder, int sky_nside, int index_nside) {
    const HealpixGrid grid(sky_nside), index_grid(index_nside);
    std::vector<double> intensity = sample(grid, test_brightness), q = sample(grid, test_q);
    intensity[5] = q[9] = -1.6375e30;
    fits_map(sky_nside, {intensity, q, sample(grid, test_u)}, "mK_RJ")
        .card("POLCCONV", "'IAU     '")
        .write(folder / "sky.fits");
    std::vector<double> index = sample(index_grid, test_index);
    index[7] = -1.6375e30;
    fits_map(index_nside, {index}).write(folder / "index.fits");
    fits_map(index_nside, {sample(index_grid, test_curvature)})
        .card("COORDSYS", "'C       '")
        .write(folder / "curvature.fits");
    std::vector<double> angle = sample(grid, [](const Vector3& n) { return 90 * n[0]; });
    fits_map(sky_nside, {angle}).card("POLCCONV", "'IAU     '").write(folder / "angle.fits");
    fits_map(index_nside, {sample(index_grid, [](const Vector3& n) { return 0.2 + 0.1 * n[1]; })})
        .write(folder / "fraction.fits");
}

constexpr const char* templates = R"(reference_frequency = "408 MHz"
[intensity]
map = "sky.fits"
column = 1
zero_level = "2 mK_RJ"
[index]
map = "index.fits"
frequency = "1 GHz"
[curvature]
map = "curvature.fits"
)";
constexpr const char* stokes = R"([polarization]
map = "sky.fits"
columns = [2, 3]
reference_frequency = "1.4 GHz"
)";
constexpr const char* fraction = R"([polarization]
fraction_map = "fraction.fits"
angle_map = "angle.fits"
reference_frequency = "1.4 GHz"
index_map = "index.fits"
)";

// Undefined where undefined, else within a tolerance relative to the largest value.
void expect_near(const std::vector<double>& got, const std::vector<double>& expected,
                 const std::vector<std::int64_t>& pixels, double tolerance, const char* what) {
    ASSERT_EQ(got.size(), expected.empty() ? 0 : pixels.size()) << what;
    double largest = 0;
    for (const double value : expected)
        if (is_defined(value)) largest = std::max(largest, std::abs(value));
    for (std::size_t i = 0; i < got.size(); ++i) {
        const double value = expected[static_cast<std::size_t>(pixels[i])];
        ASSERT_EQ(is_defined(got[i]), is_defined(value)) << what << " " << pixels[i];
        if (!is_defined(value)) continue;
        EXPECT_NEAR(got[i], value, tolerance * largest) << what << " " << pixels[i];
    }
}

/// Holds single pixels against the whole sky that make makes.
void expect_like_the_whole_sky(const std::filesystem::path& folder, const std::string& text, int nside) {
    const ModelSpec model = make_model(text, folder / "model.toml", "model");
    Progress progress;
    const SkyModel whole = load_sky(model, HealpixGrid(nside), 2 * nside, true, progress);
    const SkyStrip expected = make_sky_strip(whole, whole_sky(whole.grid), true);
    const PointSky sky(model, HealpixGrid(nside), true);
    EXPECT_TRUE(sky.grid() == whole.grid);
    EXPECT_EQ(sky.frame(), whole.frame);
    std::vector<std::int64_t> pixels;
    for (std::int64_t p = 0; p < whole.grid.npix(); ++p)
        pixels.push_back(p * 5 % whole.grid.npix());
    const SkyStrip got = sky.evaluate(pixels);
    // Interpolation weights differ by 2e-15 nside between the two samplers, and sums by their order.
    constexpr double tolerance = 1e-12;
    expect_near(got.intensity, expected.intensity, pixels, tolerance, "intensity");
    expect_near(got.index, expected.index, pixels, tolerance, "index");
    expect_near(got.curvature, expected.curvature, pixels, tolerance, "curvature");
    expect_near(got.q, expected.q, pixels, tolerance, "q");
    expect_near(got.u, expected.u, pixels, tolerance, "u");
    expect_near(got.polarized_index, expected.polarized_index, pixels, tolerance, "polarized index");
    expect_near(got.polarized_curvature, expected.polarized_curvature, pixels, tolerance,
                "polarized curvature");
}

TEST(PointSky, IsTheSkyOfMakeWithIndicesFromTheSameACoarserAndAFinerGrid) {
    for (const int index_nside : {8, 4, 32}) {
        const TemporaryFolder folder;
        write_maps(folder, 8, index_nside);
        expect_like_the_whole_sky(folder.path(), std::string(templates) + stokes, 8);
        expect_like_the_whole_sky(folder.path(), std::string(templates) + fraction, 8);
    }
}

TEST(PointSky, AnswersOnTheTemplatesOwnGridAndSaysWhatItApproximates) {
    const TemporaryFolder folder;
    write_maps(folder, 8, 4);
    const ModelSpec model = make_model(templates, folder / "model.toml", "model");
    const PointSky own(model, std::nullopt, false);
    EXPECT_EQ(own.grid().nside(), 8);
    EXPECT_TRUE(own.notices().empty());
    EXPECT_TRUE(own.evaluate(std::vector<std::int64_t>{0}).q.empty());
    const PointSky coarser(model, HealpixGrid(4), false);
    ASSERT_EQ(coarser.notices().size(), 1U);
    EXPECT_NE(coarser.notices()[0].find("mean of its pixels"), std::string::npos);
    // The mean of the four children, by their nested numbers.
    const HealpixGrid fine(8), coarse(4);
    const std::int64_t pixel = 100, nested = coarse.ring_to_nested(pixel);
    std::vector<std::int64_t> children;
    for (std::int64_t k = 0; k < 4; ++k)
        children.push_back(fine.nested_to_ring(4 * nested + k));
    const std::vector<double> values = own.evaluate(children).intensity;
    EXPECT_NEAR(coarser.evaluate(std::vector<std::int64_t>{pixel}).intensity[0],
                (values[0] + values[1] + values[2] + values[3]) / 4, 1e-15 * values[0]);
    EXPECT_THROW(PointSky(model, std::nullopt, true), InputError);  // it has no [polarization]
}

TEST(PointSky, TurnsAPolarizationTemplateOfAnotherFrame) {
    const TemporaryFolder folder;
    write_maps(folder, 32, 4);
    const HealpixGrid grid(32);
    fits_map(32, {sample(grid, test_q), sample(grid, test_u)}, "mK_RJ")
        .card("POLCCONV", "'COSMO   '")
        .card("COORDSYS", "'C       '")
        .write(folder / "turned.fits");
    const std::string text =
        std::string(templates) + "[polarization]\nmap = \"turned.fits\"\ncolumns = [1, 2]\n";
    const ModelSpec model = make_model(text, folder / "model.toml", "model");
    Progress progress;
    const SkyModel whole = load_sky(model, grid, 64, true, progress);
    const SkyStrip expected = make_sky_strip(whole, whole_sky(grid), true);
    std::vector<std::int64_t> pixels;
    for (std::int64_t p = 0; p < grid.npix(); p += 37)
        pixels.push_back(p);
    const PointSky sky(model, grid, true);
    const SkyStrip got = sky.evaluate(pixels);
    EXPECT_EQ(sky.notices().size(), 1U);
    // Bilinear interpolation of structure of some 20 deg on pixels of 1.8 deg: (1.8/20)^2 of it, 8e-3; the
    // sky is of the order of 2 mK.
    for (std::size_t i = 0; i < pixels.size(); ++i) {
        EXPECT_NEAR(got.q[i], expected.q[static_cast<std::size_t>(pixels[i])], 2e-5) << pixels[i];
        EXPECT_NEAR(got.u[i], expected.u[static_cast<std::size_t>(pixels[i])], 2e-5) << pixels[i];
    }
}

TEST(PointSky, IsTheBundledSketchWhetherFewOrManyRingsAreAsked) {
    const ModelSpec model = read_bundled_model("quick-sketch");
    ASSERT_TRUE(model.sketch.has_value());
    const HealpixGrid grid(16);
    Progress progress;
    const SkyModel whole = load_sky(model, grid, 32, true, progress);
    const SkyStrip expected = make_sky_strip(whole, whole_sky(grid), true);
    const PointSky sky(model, grid, true);
    std::vector<std::int64_t> pixels{3, 1500, 700, 701, 3};
    for (int round = 0; round < 2; ++round) {
        const SkyStrip got = sky.evaluate(pixels);
        // A ring by itself differs from a whole synthesis by rounding, of fields of unit size.
        expect_near(got.intensity, expected.intensity, pixels, 1e-12, "intensity");
        expect_near(got.index, expected.index, pixels, 1e-12, "index");
        expect_near(got.curvature, expected.curvature, pixels, 1e-12, "curvature");
        expect_near(got.q, expected.q, pixels, 1e-12, "q");
        expect_near(got.u, expected.u, pixels, 1e-12, "u");
        pixels.clear();
        for (std::int64_t p = 0; p < grid.npix(); ++p)
            pixels.push_back(p);
    }
}

}  // namespace
}  // namespace foreglow
