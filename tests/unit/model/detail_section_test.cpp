// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/detail_section.h"

#include <gtest/gtest.h>

#include "base/error.h"
#include "io/toml_document.h"

namespace foreglow {
namespace {

DetailSpec detail_of(const std::string& text) {
    const TomlValue document = parse_toml(text, "m.toml");
    return read_detail(TomlReader(document, "[detail]"), {});
}

std::string message_of(const std::string& text) {
    try {
        static_cast<void>(detail_of(text));
    } catch (const InputError& error) {
        return error.what();
    }
    return "";
}

bool has(const std::string& text, const std::string& part) {
    return text.find(part) != std::string::npos;
}

TEST(DetailSection, ReadsEveryKey) {
    const DetailSpec d = detail_of(
        "slope = -2.7\namplitude = \"0.01 K_RJ^2\"\npivot = 100\npolarization_slope = -2.4\n"
        "polarization_amplitude = \"25 uK_CMB^2\"\nlmax = 640\nmodulation = 0.8\nmodulation_floor = 0.2\n"
        "polarization_modulation = \"intensity\"\nenvelope_fwhm = \"5 deg\"\nlatitude_cut = \"0 deg\"\n"
        "form = \"lognormal\"\nb_to_e = 0.5\nte_correlation = -0.1\ncap_polarization = true\n");
    ASSERT_TRUE(d.intensity && d.polarization);
    EXPECT_EQ(d.intensity->slope, -2.7);
    EXPECT_EQ(d.intensity->pivot, 100);
    EXPECT_EQ(d.polarization->amplitude.value, 25);
    EXPECT_EQ(d.polarization->amplitude.unit.kind, BrightnessUnit::Kind::Thermodynamic);
    EXPECT_EQ(d.lmax, 640);
    EXPECT_EQ(d.modulation, 0.8);
    EXPECT_EQ(d.modulation_floor, 0.2);
    EXPECT_EQ(d.polarization_modulation, ModulationSource::Intensity);
    EXPECT_NEAR(d.envelope_fwhm.degrees(), 5, 1e-12);
    EXPECT_EQ(d.latitude_cut.radians(), 0);
    EXPECT_EQ(d.form, DetailForm::Lognormal);
    EXPECT_EQ(d.te_correlation, -0.1);
    EXPECT_TRUE(d.cap_polarization);
    EXPECT_EQ(detail_of("fit_lrange = [30, 90]\n").fit_lrange->last, 90);
    EXPECT_FALSE(detail_of("").fit_lrange);
}

TEST(DetailSection, RefusesContradictions) {
    const std::string law = "slope = -2.7\namplitude = \"0.01 K_RJ^2\"\n";
    EXPECT_TRUE(has(message_of("fit_lrange = [30, 90]\n" + law), "m.toml:2:9: 'slope'"));
    EXPECT_TRUE(has(message_of("fit_lrange = [30, 90]\n" + law), "contradicts 'fit_lrange'"));
    EXPECT_TRUE(has(message_of("slope = -2.7\n"), "stands alone"));
    EXPECT_TRUE(has(message_of("polarization_amplitude = \"1 K_RJ^2\"\n"), "add polarization_slope"));
    EXPECT_TRUE(has(message_of("pivot = 80\n"), "there are none"));
    EXPECT_TRUE(has(message_of("fit_lrange = [90, 30]\n"), "must rise"));
    EXPECT_TRUE(has(message_of("slope = -2.7\namplitude = \"0.01 K_RJ\"\n"), "squared brightness"));
    EXPECT_TRUE(has(message_of("slope = -2.7\namplitude = \"-1 K_RJ^2\"\n"), "must not be negative"));
    EXPECT_TRUE(has(message_of("forme = \"lognormal\"\n"), "did you mean 'form'"));
    EXPECT_TRUE(has(message_of("latitude_cut = \"80 deg\"\n"), "between 0 and 75 deg"));
}

TEST(ScatterKeys, StandForAnRmsOrALength) {
    const auto scatter_of = [](const std::string& text) {
        const TomlValue document = parse_toml(text, "m.toml");
        TomlReader reader(document, "[index]");
        return read_scatter(reader, 2);
    };
    EXPECT_FALSE(scatter_of(""));
    EXPECT_EQ(scatter_of("scatter = 0.1\n")->rms, 0.1);
    EXPECT_EQ(scatter_of("decorrelation_length = 20\n")->rms, 0.05);
    const auto all = scatter_of("scatter = 0.1\nscatter_slope = -3\nscatter_lrange = [4, 60]\n");
    EXPECT_EQ(all->slope, -3);
    EXPECT_EQ(all->lrange.first, 4);
    EXPECT_THROW(static_cast<void>(scatter_of("scatter = 0.1\ndecorrelation_length = 20\n")), InputError);
    EXPECT_THROW(static_cast<void>(scatter_of("scatter_slope = -3\n")), InputError);
    EXPECT_THROW(static_cast<void>(scatter_of("scatter = 3\n")), InputError);
}

}  // namespace
}  // namespace foreglow
