// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/smoothed_survey.h"

#include <gtest/gtest.h>

#include <cmath>
#include <numeric>

#include "base/error.h"
#include "base/random.h"
#include "sphere/beam.h"
#include "sphere/gaussian_field.h"
#include "sphere/harmonics.h"
#include "support/fits_builder.h"
#include "support/messages.h"
#include "support/sky_builder.h"

namespace foreglow {
namespace {

using testing::fits_map;
using testing::has;
using testing::message_of;

class SmoothSurveys : public ::testing::Test {
  protected:
    [[nodiscard]] SmoothedSurveys run(const std::string& top, const std::string& first) const {
        const std::string text =
            "reference_frequency = \"1 GHz\"\n" + top +
            "[[survey]]\nmap = \"a.fits\"\nfrequency = \"1 GHz\"\n" + first +
            "[[survey]]\nmap = \"b.fits\"\nfrequency = \"2 GHz\"\nbeam_fwhm = \"8 deg\"\n"
            "noise = \"1 K_RJ\"\n";
        Progress progress;
        return smooth_surveys(make_surveys(text, folder_ / "surveys.toml"), progress);
    }
    void write(const std::string& name, int nside, const std::vector<double>& values) const {
        fits_map(nside, {values}, "K_RJ").write(folder_ / name);
    }
    testing::TemporaryFolder folder_;
};

std::vector<double> make_noise(const HealpixGrid& grid, std::uint32_t realization) {
    std::vector<double> out;
    for (std::int64_t p = 0; p < grid.npix(); ++p)
        out.push_back(normal_pair({5, realization, 0}, static_cast<std::uint32_t>(p), 0)[0]);
    return out;
}

TEST_F(SmoothSurveys, BringABandLimitedSkyToTheCommonBeam) {
    const HealpixGrid fine(32), coarse(16);
    std::vector<double> cl(31, 1.0);
    const Alm sky = make_gaussian_alm(cl, 30, {1, 0, 0});
    Alm own = sky, common = sky;
    apply_beam(make_gaussian_beam(Angle::from_degrees(6), 30), own);
    apply_beam(make_gaussian_beam(Angle::from_degrees(10), 30), common);
    write("a.fits", 32, synthesize(own, fine));
    write("b.fits", 16, std::vector<double>(3072, 1.0));
    const auto out = run("nside = 16\nbeam_fwhm = \"10 deg\"\n",
                         "beam_fwhm = \"6 deg\"\nnoise = \"2 K_RJ\"\nzero_level = \"5 K_RJ\"\n");
    EXPECT_FALSE(out.report.pixel_for_pixel);
    EXPECT_NEAR(out.surveys[0].extra_beam.degrees(), 8, 1e-9);
    const auto expected = synthesize(common, coarse);
    for (std::size_t p = 0; p < expected.size(); ++p)
        EXPECT_NEAR(out.surveys[0].values[p], expected[p] - 5, 2e-5);  // a_lm to 1e-6 of an rms of 8
}

TEST_F(SmoothSurveys, KeepWhatIsAlreadyThere) {
    const HealpixGrid grid(16);
    auto values = testing::sample(grid, testing::test_brightness);
    values[7] = undefined_pixel;
    write("a.fits", 16, values);
    write("b.fits", 16, values);
    const auto out =
        run("nside = 16\nbeam_fwhm = \"8 deg\"\n", "beam_fwhm = \"8 deg\"\nnoise = \"2 K_RJ\"\n");
    EXPECT_TRUE(out.report.pixel_for_pixel);
    EXPECT_EQ(out.surveys[0].undefined, 1);
    for (std::size_t p = 8; p < values.size(); ++p)
        EXPECT_EQ(out.surveys[0].values[p], values[p]);
    EXPECT_EQ(out.surveys[0].variance(3), 4);
}

// Noise maps drawn and smoothed, against the variance that is quoted.
TEST_F(SmoothSurveys, CarryTheNoiseThroughTheSmoothing) {
    const HealpixGrid grid(32);
    std::vector<double> rms;
    for (std::int64_t p = 0; p < grid.npix(); ++p)
        rms.push_back(1 + 0.8 * grid.direction(p)[2]);
    write("rms.fits", 32, rms);
    write("b.fits", 16, std::vector<double>(3072, 1.0));
    for (const bool uniform : {true, false}) {
        double ratio = 0;
        constexpr std::uint32_t draws = 10;
        double north = 0, south = 0;
        for (std::uint32_t r = 0; r < draws; ++r) {
            auto noise = make_noise(grid, r);
            for (std::size_t p = 0; p < noise.size(); ++p)
                noise[p] *= uniform ? 1.5 : rms[p];
            write("a.fits", 32, noise);
            const auto out = run("nside = 16\nbeam_fwhm = \"10 deg\"\n",
                                 std::string("beam_fwhm = \"6 deg\"\n") +
                                     (uniform ? "noise = \"1.5 K_RJ\"\n" : "noise_map = \"rms.fits\"\n"));
            const SmoothedSurvey& survey = out.surveys[0];
            for (std::size_t p = 0; p < survey.values.size(); ++p) {
                const double pull = survey.values[p] * survey.values[p] / survey.variance(p);
                ratio += pull;
                (p < survey.values.size() / 2 ? north : south) += pull;
            }
            // The kernel of 8 deg covers 4 pi sigma^2 = 145 square degrees: 284 independent samples of the
            // sky a draw.
            EXPECT_NEAR(survey.noise_area * std::pow(180 / 3.14159265, 2), 145, 3);
        }
        const double n = 3072.0 * draws;
        // Of 2840 samples the variance is known to 2.7 %, of a half to 3.8 %; four of these.
        EXPECT_NEAR(ratio / n, 1, 0.11) << uniform;
        EXPECT_NEAR(2 * north / n, 1, 0.15) << uniform;
        EXPECT_NEAR(2 * south / n, 1, 0.15) << uniform;
    }
}

TEST_F(SmoothSurveys, RefuseANoiseMapOfAnotherGrid) {
    write("a.fits", 32, std::vector<double>(12288, 1.0));
    write("b.fits", 16, std::vector<double>(3072, 1.0));
    write("rms.fits", 16, std::vector<double>(3072, 1.0));
    const std::string message = message_of<InputError>([&] {
        return run("nside = 16\nbeam_fwhm = \"10 deg\"\n",
                   "beam_fwhm = \"6 deg\"\nnoise_map = \"rms.fits\"\n");
    });
    EXPECT_TRUE(has(message, "own grid")) << message;
}

}  // namespace
}  // namespace foreglow
