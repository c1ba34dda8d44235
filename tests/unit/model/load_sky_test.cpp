// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/load_sky.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "model/model_file.h"
#include "sphere/gaussian_field.h"
#include "sphere/regrid.h"
#include "sphere/rotation.h"
#include "support/messages.h"
#include "support/sky_builder.h"

namespace foreglow {
namespace {

using testing::fits_map;
using testing::has;
using testing::make_map;
using testing::message_of;
using testing::relative_rms;
using testing::sample;
using testing::whole_sky;

const char* const head = "reference_frequency = \"408 MHz\"\n";

class LoadSky : public ::testing::Test {
  protected:
    // T.fits, INDEX.fits, ... in double precision, galactic, COSMO.
    void write(const std::string& name, int nside, const std::vector<std::vector<double>>& columns,
               const std::string& unit = "", const char* frame = "'G       '") const {
        fits_map(nside, columns, unit)
            .card("COORDSYS", frame)
            .card("POLCCONV", "'COSMO   '")
            .write(folder_ / name);
    }
    void write_usual(int nside) const {
        const HealpixGrid grid(nside);
        write("t.fits", nside, {sample(grid, testing::test_brightness)}, "K_RJ");
        write("index.fits", nside, {sample(grid, testing::test_index)});
        write("c.fits", nside, {sample(grid, testing::test_curvature)});
        write("qu.fits", nside, {sample(grid, testing::test_q), sample(grid, testing::test_u)}, "K_RJ");
    }
    ModelSpec model(const std::string& text) const { return make_model(text, folder_ / "m.toml", "m"); }
    SkyModel load(const std::string& text, int nside, bool polarized = false) {
        return load_sky(model(text), HealpixGrid(nside), 2 * nside, polarized, progress_);
    }
    SkyStrip strip(const std::string& text, int nside, bool polarized = false) {
        const SkyModel sky = load(text, nside, polarized);
        return make_sky_strip(sky, whole_sky(sky.grid), polarized);
    }
    ModelMaps check(const std::string& text, bool polarized) const {
        return check_model_maps(model(text), HealpixGrid(8), 16, polarized);
    }

    testing::TemporaryFolder folder_;
    Progress progress_;
    const std::string t_ = std::string(head) + "[intensity]\nmap = \"t.fits\"\n";
    const std::string index_ = "[index]\nmap = \"index.fits\"\n";
    const std::string flat_ = "[index]\nvalue = -2.9\n";
    const std::string c_ = "[curvature]\nmap = \"c.fits\"\n";
    const std::string qu_ = "[polarization]\nmap = \"qu.fits\"\ncolumns = [1, 2]\n";
};

TEST_F(LoadSky, MapsOnTheStudysGridAreUsedPixelForPixel) {
    write_usual(8);
    const SkyStrip values = strip(t_ + index_ + c_ + qu_, 8, true);
    EXPECT_EQ(values.intensity, sample(HealpixGrid(8), testing::test_brightness));
    EXPECT_EQ(values.index, sample(HealpixGrid(8), testing::test_index));
    EXPECT_EQ(values.curvature, sample(HealpixGrid(8), testing::test_curvature));
    EXPECT_EQ(values.q, sample(HealpixGrid(8), testing::test_q));
    EXPECT_EQ(values.u, sample(HealpixGrid(8), testing::test_u));
    EXPECT_TRUE(progress_.notices().empty());
}

TEST_F(LoadSky, TheZeroLevelIsSubtractedInItsOwnUnit) {
    write_usual(4);
    const SkyStrip plain = strip(t_ + flat_, 4);
    EXPECT_NEAR(strip(t_ + "zero_level = \"8.9 K_RJ\"\n" + flat_, 4).intensity[7], plain.intensity[7] - 8.9,
                1e-12);
    const double x = 6.62607015e-34 * 408e6 / (1.380649e-23 * 2.7255);
    const double factor = x * x * std::exp(x) / std::pow(std::expm1(x), 2);
    EXPECT_NEAR(strip(t_ + "zero_level = \"2725.5 mK_CMB\"\n" + flat_, 4).intensity[7],
                plain.intensity[7] - 2.7255 * factor, 1e-12);
}

TEST_F(LoadSky, AnIndexMeasuredElsewhereIsCarriedToTheReference) {
    write_usual(4);
    const SkyStrip plain = strip(t_ + index_ + c_, 4),
                   at_1 = strip(t_ + index_ + "frequency = \"1 GHz\"\n" + c_, 4);
    const SkyStrip chord = strip(t_ + index_ + "between = [\"408 MHz\", \"23 GHz\"]\n" + c_, 4);
    for (std::size_t p = 0; p < 192; ++p) {
        EXPECT_NEAR(at_1.index[p], plain.index[p] - 2 * plain.curvature[p] * std::log(1000.0 / 408), 1e-14);
        // The chord from 408 MHz, which is nu0: beta + c ln(23 GHz/408 MHz).
        EXPECT_NEAR(chord.index[p] + chord.curvature[p] * std::log(23000.0 / 408), plain.index[p], 1e-13);
    }
}

TEST_F(LoadSky, PolarizationHasItsOwnReferenceAndUnit) {
    write_usual(4);
    write("qu.fits", 4, {std::vector<double>(192, 20.0), std::vector<double>(192, -5.0)}, "uK_CMB");
    const SkyModel sky =
        load(t_ + index_ + qu_ + "reference_frequency = \"23 GHz\"\nindex = -3.1\n", 4, true);
    EXPECT_EQ(sky.polarization->reference.hz(), 23e9);
    const SkyStrip values = make_sky_strip(sky, whole_sky(sky.grid), true);
    const double x =
        6.62607015e-34 * 23e9 / (1.380649e-23 * 2.7255);  // of 23 GHz, not of 408 MHz: 1.4 % apart
    const double factor = x * x * std::exp(x) / std::pow(std::expm1(x), 2);
    EXPECT_NEAR(values.q[3] / (20e-6 * factor), 1, 1e-12);
    EXPECT_NEAR(values.u[3] / (-5e-6 * factor), 1, 1e-12);
    EXPECT_EQ(values.index_of_polarization()[3], -3.1);
    EXPECT_EQ(values.curvature_of_polarization()[3], 0.0);
}

TEST_F(LoadSky, FractionAndAngleMakeQAndU) {
    write_usual(4);
    write("angle.fits", 4, {sample(HealpixGrid(4), [](const Vector3& n) { return 40 * n[0]; })});
    write("fraction.fits", 4, {sample(HealpixGrid(4), [](const Vector3& n) { return 0.3 + 0.1 * n[2]; })});
    const std::string text =
        t_ + index_ + c_ + "[polarization]\nangle_map = \"angle.fits\"\nreference_frequency = \"23 GHz\"\n";
    for (const bool is_map : {false, true}) {
        const SkyStrip values =
            strip(text + (is_map ? "fraction_map = \"fraction.fits\"\n" : "fraction = 0.2\n"), 4, true);
        for (std::size_t p = 0; p < 192; ++p) {
            const Vector3 n = HealpixGrid(4).direction(static_cast<std::int64_t>(p));
            const double ln = std::log(23e9 / 408e6);
            const double there =
                values.intensity[p] * std::exp(ln * (values.index[p] + values.curvature[p] * ln));
            const double length = there * (is_map ? 0.3 + 0.1 * n[2] : 0.2);
            const double twice = 80 * n[0] * 3.14159265358979323846 / 180;
            EXPECT_NEAR(values.q[p] / length, std::cos(twice), 1e-12);
            EXPECT_NEAR(values.u[p] / length, std::sin(twice), 1e-12);
        }
    }
}

TEST_F(LoadSky, IauTemplatesGiveTheSameSky) {
    write_usual(4);
    const SkyStrip cosmo = strip(t_ + flat_ + qu_, 4, true);
    auto minus_u = sample(HealpixGrid(4), testing::test_u);
    for (double& value : minus_u)
        value = -value;
    fits_map(4, {sample(HealpixGrid(4), testing::test_q), minus_u}, "K_RJ")
        .card("POLCCONV", "'IAU     '")
        .write(folder_ / "qu.fits");
    const SkyStrip iau = strip(t_ + flat_ + qu_, 4, true);
    EXPECT_EQ(iau.q, cosmo.q);
    EXPECT_EQ(iau.u, cosmo.u);
}

// A template of another nside goes through its a_lm: one limited to l <= 16 comes out as the same a_lm give
// it on the other grid.
TEST_F(LoadSky, ABandLimitedTemplateKeepsItsCoefficientsOnAnyGrid) {
    std::vector<double> cl(17, 0.0);
    for (std::size_t l = 0; l < cl.size(); ++l)
        cl[l] = 1 / (1.0 + static_cast<double>(l * l));
    const Alm t = make_gaussian_alm(cl, 16, {1, 0, 0});
    cl[0] = cl[1] = 0;
    const AlmEB eb{make_gaussian_alm(cl, 16, {1, 0, 1}), make_gaussian_alm(cl, 16, {1, 0, 2})};
    const HealpixGrid own(16);
    const StokesValues qu = synthesize_spin2(eb, own);
    write("t.fits", 16, {synthesize(t, own)}, "K_RJ");
    write("qu.fits", 16, {qu.q, qu.u}, "K_RJ");
    for (const int nside : {8, 32}) {
        const SkyStrip values = strip(t_ + flat_ + qu_, nside, true);
        const HealpixGrid grid(nside);
        const StokesValues expected = synthesize_spin2(eb, grid);
        EXPECT_LT(relative_rms(values.intensity, synthesize(t, grid)),
                  1e-7);  // the template's tolerance is 1e-8
        EXPECT_LT(relative_rms(values.q, expected.q), 1e-7);
        EXPECT_LT(relative_rms(values.u, expected.u), 1e-7);
    }
    ASSERT_FALSE(progress_.notices().empty());
    EXPECT_TRUE(
        has(progress_.notices().back(), "template brought from nside 16 to 32 through its a_lm up to l = 40"))
        << progress_.notices().back();
}

TEST_F(LoadSky, MapsInOtherFramesAreTurnedIntoThatOfTheIntensity) {
    std::vector<double> cl(11, 1.0);
    cl[0] = cl[1] = 0;
    AlmEB eb{make_gaussian_alm(cl, 10, {1, 0, 1}), make_gaussian_alm(cl, 10, {1, 0, 2})};
    const HealpixGrid grid(16);
    const StokesValues icrs = synthesize_spin2(eb, grid);
    write_usual(16);
    write("qu.fits", 16, {icrs.q, icrs.u}, "K_RJ", "'C       '");
    write("index.fits", 64, {sample(HealpixGrid(64), [](const Vector3& n) { return -3 + 0.2 * n[0]; })}, "",
          "'C       '");
    const SkyModel sky = load(t_ + index_ + qu_, 16, true);
    EXPECT_EQ(sky.frame, Frame::Galactic);
    const SkyStrip values = make_sky_strip(sky, whole_sky(grid), true);
    rotate_alm(eb, Frame::Icrs, Frame::Galactic);
    const StokesValues expected = synthesize_spin2(eb, grid);
    EXPECT_LT(relative_rms(values.q, expected.q), 1e-7);
    EXPECT_LT(relative_rms(values.u, expected.u), 1e-7);
    const Matrix3 back = rotation_between(Frame::Galactic, Frame::Icrs);
    for (std::int64_t p = 0; p < grid.npix();
         ++p)  // means over 16 pixels, then bilinear on nside 16: 0.2 (pixel 0.064 rad)^2
        EXPECT_NEAR(values.index[static_cast<std::size_t>(p)], -3 + 0.2 * rotate(back, grid.direction(p))[0],
                    4e-3);
}

TEST_F(LoadSky, AFinerIndexMapIsCoarsenedByItsBrightnessWeightedMean) {
    const HealpixGrid fine(16), grid(8);
    const auto brightness = sample(fine, testing::test_brightness), index = sample(fine, testing::test_index);
    write("t.fits", 16, {brightness}, "K_RJ");
    write("index.fits", 16, {index});
    const SkyStrip values = strip(t_ + index_, 8);
    std::vector<double> sum(768, 0), weight(768, 0);
    for (std::int64_t p = 0; p < fine.npix(); ++p) {
        const auto parent = static_cast<std::size_t>(grid.nested_to_ring(fine.ring_to_nested(p) / 4));
        sum[parent] += brightness[static_cast<std::size_t>(p)] * index[static_cast<std::size_t>(p)];
        weight[parent] += brightness[static_cast<std::size_t>(p)];
    }
    for (std::size_t p = 0; p < 768; ++p)
        EXPECT_NEAR(values.index[p], sum[p] / weight[p], 1e-13);
}

TEST_F(LoadSky, UndefinedPixelsOfEachInputStayUndefined) {
    write_usual(8);
    const auto holed = [](std::vector<double> values) {
        values[100] = std::nan("");
        return values;
    };
    const HealpixGrid grid(8);
    write("t.fits", 8, {holed(sample(grid, testing::test_brightness))}, "K_RJ");
    write("index.fits", 8, {holed(sample(grid, testing::test_index))});
    write("c.fits", 8, {holed(sample(grid, testing::test_curvature))});
    write("qu.fits", 8, {holed(sample(grid, testing::test_q)), sample(grid, testing::test_u)}, "K_RJ");
    const SkyStrip values = strip(t_ + index_ + c_ + qu_, 8, true);
    for (const auto* one : {&values.intensity, &values.index, &values.curvature, &values.q, &values.u}) {
        EXPECT_EQ(testing::undefined_count(*one), 1);
        EXPECT_FALSE(is_defined((*one)[100]));
    }
    // Through a_lm: what lies over the hole is undefined, the rest is not.
    const SkyStrip finer = strip(t_ + index_ + c_ + qu_, 16, true);
    const Vector3 hole = grid.direction(100);
    for (const auto* one : {&finer.intensity, &finer.q, &finer.u}) {
        EXPECT_GE(testing::undefined_count(*one), 4);
        EXPECT_LE(testing::undefined_count(*one),
                  40);  // the stencils that touch one pixel reach 3 x 3 of its size
        EXPECT_FALSE(is_defined((*one)[static_cast<std::size_t>(HealpixGrid(16).pixel_at(hole))]));
    }
    EXPECT_EQ(testing::undefined_count(finer.index), 0);  // interpolated between what is left
}

TEST_F(LoadSky, AMapOfNothingIsAnError) {
    write_usual(4);
    write("t.fits", 4, {std::vector<double>(192, std::nan(""))}, "K_RJ");
    EXPECT_THROW((void)load(t_ + flat_, 8), DataError);
}

TEST_F(LoadSky, AskingForPolarizationThatIsNotThereIsAnError) {
    write_usual(4);
    EXPECT_TRUE(
        has(message_of<InputError>([&] { return load(t_ + flat_, 4, true); }), "has no [polarization]"));
}

TEST_F(LoadSky, TheCheckFindsEveryOpenQuestionWithoutReadingPixels) {
    write_usual(8);
    const std::string whole = t_ + index_ + c_ + qu_;
    EXPECT_EQ(check(whole, true).frame, Frame::Galactic);
    const auto question = [&](const char* file, const testing::FitsMapBuilder& broken,
                              const std::string& text, const char* part) {
        const std::string good = testing::read_whole_file(folder_ / file);
        broken.write(folder_ / file);
        const std::string message = message_of<InputError>([&] { return check(text, true); });
        EXPECT_TRUE(has(message, part)) << message;
        EXPECT_EQ(message_of<InputError>(
                      [&] { return load_sky(model(text), HealpixGrid(8), 16, true, progress_); }),
                  message)
            << "make asks as plan does";
        testing::write_whole_file(folder_ / file, good);
    };
    const std::vector<double> ones(768, 1.0);
    const auto stokes = [&](const char* unit) { return fits_map(8, {ones, ones}, unit); };
    question("t.fits", fits_map(8, {ones}), whole, "add `unit = \"K_RJ\"`");
    question("t.fits", fits_map(8, {ones}, "K_RJ").without("COORDSYS"), whole, "to [intensity]");
    question("index.fits", fits_map(8, {ones}).without("COORDSYS"), whole, "to [index]");
    question("c.fits", fits_map(8, {ones}).without("COORDSYS"), whole, "to [curvature]");
    question("qu.fits", stokes("K_RJ"), whole,
             "`polarization_convention = \"COSMO\"` (or \"IAU\") to [polarization]");
    question("qu.fits", stokes("").card("POLCCONV", "'COSMO   '"), whole, "to [polarization]");
    write("angle.fits", 8, {ones});
    question("angle.fits", fits_map(8, {ones}),
             t_ + flat_ + "[polarization]\nfraction = 0.2\nangle_map = \"angle.fits\"\n",
             "polarization_convention");
    fits_map(8, {ones, ones}, "K_RJ").write(folder_ / "qu.fits");
    EXPECT_NO_THROW((void)check(whole, false)) << "what the study does not ask for need not be answered";
}

TEST_F(LoadSky, TheCheckCountsWhatStaysInMemory) {
    write_usual(8);
    EXPECT_EQ(check(t_ + flat_, false).held_values, 768);
    EXPECT_EQ(check(t_ + index_ + c_ + qu_, true).held_values, 5 * 768);
    EXPECT_EQ(check(t_ + index_, false).largest_nside, 8);
}

TEST_F(LoadSky, TheBundledSkyNeedsNoFile) {
    const ModelSpec bundled = read_bundled_model("quick-sketch");
    EXPECT_EQ(check_model_maps(bundled, HealpixGrid(8), 16, true).frame, Frame::Galactic);
    const SkyModel sky = load_sky(bundled, HealpixGrid(8), 16, true, progress_);
    EXPECT_FALSE(sky.labels.empty());
    EXPECT_TRUE(sky.polarization.has_value());
}

}  // namespace
}  // namespace foreglow
