// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/model_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <string>

#include "base/error.h"
#include "model/bundled_models.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

bool has(const std::string& message, const std::string& part) {
    return message.find(part) != std::string::npos;
}

constexpr const char* head = "reference_frequency = \"408 MHz\"\n";
constexpr const char* intensity = "[intensity]\nmap = \"survey.fits\"\n";
constexpr const char* index_value = "[index]\nvalue = -2.9\n";

class ModelFile : public ::testing::Test {
  protected:
    void SetUp() override {
        for (const char* name : {"survey.fits", "index.fits", "angle.fits"})
            std::ofstream(folder_ / name) << "x";
    }

    ModelSpec make(const std::string& text) const { return make_model(text, folder_ / "m.toml", "m"); }
    std::string message_of(const std::string& text) const {
        try {
            (void)make(text);
        } catch (const InputError& error) {
            const std::string message = error.what();
            const std::string file = (folder_ / "m.toml").string();
            return message.substr(0, file.size()) == file ? "m.toml" + message.substr(file.size()) : message;
        }
        return "";
    }
    testing::TemporaryFolder folder_;
};

TEST_F(ModelFile, ReadsEveryKeyOfIntensityIndexAndCurvature) {
    const ModelSpec model = make(R"(title = "T"
reference_frequency = "408 MHz"
[intensity]
map = "survey.fits"
column = "TEMPERATURE"
hdu = 2
ordering = "nested"
unit = "mK_RJ"
frame = "icrs"
beam_fwhm = "56 arcmin"
zero_level = "8.9 K_RJ"
[index]
map = "index.fits"
column = 2
frame = "galactic"
frequency = "1 GHz"
[curvature]
value = -0.04
)");
    EXPECT_EQ(model.title, "T");
    EXPECT_EQ(model.name, "m");
    EXPECT_EQ(model.reference_frequency.hz(), 408e6);
    const MapSource& map = model.intensity->map;
    EXPECT_EQ(map.path, folder_ / "survey.fits");
    EXPECT_EQ(map.place, (folder_ / "m.toml").string() + ":4:7");
    EXPECT_EQ(map.section, "intensity");
    EXPECT_EQ(std::get<std::string>(map.columns.at(0)), "TEMPERATURE");
    EXPECT_EQ(map.hdu, 2);
    EXPECT_EQ(map.ordering, Ordering::Nested);
    EXPECT_EQ(map.frame, Frame::Icrs);
    EXPECT_EQ(map.unit->scale, 1e-3);
    EXPECT_DOUBLE_EQ(model.intensity->beam_fwhm->arcmin(), 56);
    EXPECT_EQ(model.intensity->zero_level->value, 8.9);
    const auto& index = std::get<MapSource>(model.index.value);
    EXPECT_EQ(index.path, folder_ / "index.fits");
    EXPECT_EQ(std::get<int>(index.columns.at(0)), 2);
    EXPECT_EQ(model.index.frequency->hz(), 1e9);
    EXPECT_EQ(std::get<double>(model.curvature), -0.04);
    EXPECT_TRUE(model.warnings.empty());
}

TEST_F(ModelFile, TurnsBetweenIntoTheGeometricMean) {
    const ModelSpec model =
        make(std::string(head) + intensity + "[index]\nvalue = -2.9\nbetween = [\"1 GHz\", \"4 GHz\"]\n");
    EXPECT_DOUBLE_EQ(model.index.frequency->hz(), 2e9);
    EXPECT_TRUE(has(
        message_of(std::string(head) + intensity + "[index]\nvalue = -2.9\nbetween = [\"1 GHz\", \"4\"]\n"),
        "m.toml:6:21: 'between' in [index] has no unit"));
    for (const char* between : {"\"1 GHz\"", "[\"1 GHz\"]", "[1, 2]", "[\"1 GHz\", \"1 GHz\"]"})
        EXPECT_TRUE(has(
            message_of(std::string(head) + intensity + "[index]\nvalue = -2.9\nbetween = " + between + "\n"),
            "m.toml:6:"))
            << between;
}

TEST_F(ModelFile, ReadsPolarizationFromAMapAndSharesTheFilesKeys) {
    const ModelSpec model = make(std::string(head) + R"([intensity]
map = "survey.fits"
unit = "K_RJ"
frame = "galactic"
[polarization]
map = "survey.fits"
columns = [2, "U"]
reference_frequency = "22.8 GHz"
beam_fwhm = "60 arcmin"
polarization_convention = "IAU"
index = -3.1
[index]
value = -2.9
)");
    const PolarizationSpec& polarization = *model.polarization;
    EXPECT_EQ(std::get<int>(polarization.map->columns.at(0)), 2);
    EXPECT_EQ(std::get<std::string>(polarization.map->columns.at(1)), "U");
    EXPECT_EQ(polarization.reference_frequency->hz(), 22.8e9);
    EXPECT_EQ(polarization.map->convention, PolarizationConvention::Iau);
    EXPECT_EQ(polarization.map->frame, Frame::Galactic);  // of the same file, said once
    EXPECT_EQ(polarization.map->unit, BrightnessUnit{});
    EXPECT_EQ(std::get<double>(*polarization.index), -3.1);
}

TEST_F(ModelFile, ReadsPolarizationFromFractionAndAngle) {
    const ModelSpec model = make(std::string(head) + intensity + index_value + R"([polarization]
fraction = 0.2
angle_map = "angle.fits"
frame = "ecliptic"
polarization_convention = "COSMO"
index_map = { map = "index.fits", column = 3, frame = "galactic" }
)");
    const PolarizationSpec& polarization = *model.polarization;
    EXPECT_FALSE(polarization.map.has_value());
    EXPECT_EQ(std::get<double>(*polarization.fraction), 0.2);
    EXPECT_EQ(polarization.angle_map->path, folder_ / "angle.fits");
    EXPECT_EQ(polarization.angle_map->frame, Frame::Ecliptic);
    EXPECT_EQ(polarization.angle_map->convention, PolarizationConvention::Cosmo);
    const auto& index = std::get<MapSource>(*polarization.index);
    EXPECT_EQ(std::get<int>(index.columns.at(0)), 3);
    EXPECT_EQ(index.frame, Frame::Galactic);
}

TEST_F(ModelFile, RefusesWrongKeysAtTheirPlace) {
    const std::string start = std::string(head) + index_value + intensity;  // the next line is line 6
    for (const char* line :
         {"column = 0", "column = 1.5", "column = \"\"", "hdu = 0", "ordering = \"up\"", "unit = \"K\"",
          "frame = \"galaktic\"", "beam_fwhm = \"0 deg\"", "zero_level = \"8.9\"", "zero_level = 8.9",
          "colum = 1", "columns = [1, 2]", "[curvature]\nvalue = 5", "[curvature]", "[polarization]",
          "[curvature]\nmap = \"none.fits\"", "[polarization]\nfraction = 1.5", "[polarisation]"}) {
        const std::string message = message_of(start + line + "\n");
        EXPECT_TRUE(has(message, "m.toml:6:") || has(message, "m.toml:7:")) << line << " -> " << message;
        EXPECT_EQ(message.find('\n'), std::string::npos) << line;
    }
    EXPECT_TRUE(has(message_of(start + "[polarisation]\nmap = \"x\"\n"), "did you mean 'polarization'?"));
}

TEST_F(ModelFile, RefusesKeysThatContradictEachOther) {
    const std::string start = std::string(head) + intensity;
    EXPECT_TRUE(
        has(message_of(start + "[index]\nvalue = -3\nmap = \"index.fits\"\n"), "contradicts 'value'"));
    EXPECT_TRUE(has(
        message_of(start + "[index]\nvalue = -3\nfrequency = \"1 GHz\"\nbetween = [\"1 GHz\", \"2 GHz\"]\n"),
        "contradicts 'frequency'"));
    EXPECT_TRUE(has(message_of(start + index_value + "[sketch]\n"), "contradicts [sketch]"));
    EXPECT_TRUE(has(message_of(start + "[index]\nvalue = -3\ncolumn = 2\n"), "no 'map'"));
    const std::string polarized = start + index_value + "[polarization]\n";
    EXPECT_TRUE(has(message_of(polarized + "map = \"survey.fits\"\nfraction = 0.2\n"), "contradicts 'map'"));
    EXPECT_TRUE(has(message_of(polarized + "map = \"survey.fits\"\nangle_map = \"angle.fits\"\n"),
                    "contradicts 'map'"));
    EXPECT_TRUE(has(message_of(polarized + "map = \"survey.fits\"\ncolumn = 2\n"), "'columns'"));
    EXPECT_TRUE(has(message_of(polarized + "map = \"survey.fits\"\ncolumns = [2, 2]\n"), "same column"));
    EXPECT_TRUE(has(message_of(polarized + "map = \"survey.fits\"\ncolumns = [2, 3, 4]\n"), "an array of 3"));
    EXPECT_TRUE(has(message_of(polarized + "map = \"survey.fits\"\nindex = -3\nindex_map = \"index.fits\"\n"),
                    "contradicts 'index'"));
    EXPECT_TRUE(has(message_of(polarized + "fraction = 0.2\n"), "'angle_map' is missing"));
    EXPECT_TRUE(has(message_of(polarized + "angle_map = \"angle.fits\"\n"), "'fraction' is missing"));
    EXPECT_TRUE(has(message_of(polarized + "fraction = 0.2\nangle_map = \"angle.fits\"\nunit = \"K_RJ\"\n"),
                    "'unit'"));
}

TEST_F(ModelFile, AsksForWhatIsMissing) {
    EXPECT_TRUE(has(message_of(std::string(intensity) + index_value),
                    "m.toml:1:1: 'reference_frequency' is missing"));
    EXPECT_TRUE(has(message_of(std::string(head) + index_value), "[intensity] is missing"));
    EXPECT_TRUE(has(message_of(std::string(head) + intensity), "[index] is missing"));
    EXPECT_TRUE(
        has(message_of(std::string(head) + "[intensity]\n" + index_value), "m.toml:2:1: 'map' is missing"));
    EXPECT_TRUE(has(message_of(std::string(head) + intensity + "[index]\n"), "neither 'value' nor 'map'"));
    const std::string no_file =
        message_of(std::string(head) + "[intensity]\nmap = \"none.fits\"\n" + index_value);
    EXPECT_TRUE(
        has(no_file, "m.toml:3:7: 'map' in [intensity] names the file 'none.fits', which does not exist"))
        << no_file;
    EXPECT_TRUE(has(message_of(std::string(head) + "[intensity]\nmap = \".\"\n" + index_value), "a folder"));
    EXPECT_TRUE(
        has(message_of(std::string(head) + "[intensity]\nmap = \"\"\n" + index_value), "does not exist"));
}

TEST_F(ModelFile, RefusesWhatIsNotThereYetByName) {
    const std::string start = std::string(head) + intensity;
    for (const char* later : {"faraday"}) {
        const std::string message = message_of(start + index_value + "[" + later + "]\n");
        EXPECT_TRUE(has(message, std::string("'") + later + "' is not there yet")) << message;
    }
}

TEST_F(ModelFile, ReadsElectrons) {
    const ModelSpec model =
        make(std::string(head) + intensity +
             "[index]\nvalue = -2.8\nbetween = [\"23 GHz\", \"408 MHz\"]\n[electrons]\nfield = \"0.4 "
             "nT\"\ngeometry = \"tangled\"\nbreak_energy = \"800 MeV\"\nbreak_step = 0.7\n"
             "cutoff_energy = \"2 TeV\"\ncutoff = \"sharp\"\naging = \"fixed-pitch\"\nage = \"0.05 "
             "Gyr\"\nredshift = 0.3\n");
    ASSERT_TRUE(model.electrons.has_value());
    const ElectronLaw& law = model.electrons->law;
    EXPECT_NEAR(law.field_uG, 4, 1e-14);  // 1 nT is 10 uG
    EXPECT_EQ(law.geometry, FieldGeometry::Tangled);
    EXPECT_NEAR(law.energy_break->energy_GeV, 0.8, 1e-15);
    EXPECT_EQ(law.energy_break->step, 0.7);
    EXPECT_EQ(law.cutoff->energy_GeV, 2000);
    EXPECT_EQ(law.cutoff->shape, CutoffShape::Sharp);
    EXPECT_NEAR(std::get<FixedPitchAging>(law.aging).age_Myr, 50, 1e-13);
    EXPECT_EQ(law.redshift, 0.3);
    EXPECT_EQ(model.index.between->first.hz(), 408e6);
}

TEST_F(ModelFile, RefusesElectronsThatContradictThemselvesOrTheRest) {
    const std::string start = std::string(head) + intensity + index_value;
    const std::string electrons = "[electrons]\nfield = \"5 uG\"\n";
    for (const auto& [text, words] :
         {std::pair(electrons + "[curvature]\nvalue = 0.1\n", "contradicts [electrons]"),
          {std::string("[electrons]\n"), "'field'"},
          {std::string("[electrons]\nfield = 5\n"), "field"},
          {electrons + "edge = \"sharp\"\n", "isotropized"},
          {electrons + "aging = \"isotropized\"\n", "how long"},
          {electrons + "age = \"1 Myr\"\n", "no ageing"},
          {electrons + "aging = \"isotropized\"\nage = \"1 Myr\"\nedge = \"exponential\"\ncutoff_energy = "
                       "\"1 TeV\"\n",
           "stands for the cut-off"},
          {electrons + "break_step = 1.0\n", "break_energy"},
          {electrons + "cutof = \"sharp\"\n", "did you mean"}}) {
        const std::string message = message_of(start + text);
        EXPECT_TRUE(has(message, words)) << message;
    }
}

TEST_F(ModelFile, WarnsOfAnIndexThatLooksLikeOneOfFlux) {
    // alpha = beta + 2: a flux index of -0.75 is a temperature index of -2.75.
    const ModelSpec model = make(std::string(head) + intensity + "[index]\nvalue = -0.75\n");
    ASSERT_EQ(model.warnings.size(), 1U);
    EXPECT_TRUE(has(model.warnings[0], "-2.75"));
}

TEST_F(ModelFile, ReadsSketches) {
    const ModelSpec model = make(std::string(head) + R"([sketch]
loops = false
texture = false
pole_brightness = "5000 mK_RJ"
plane_height = "6 deg"
index = -3
seed = 7
)");
    ASSERT_TRUE(model.sketch.has_value());
    EXPECT_TRUE(model.sketch->disc);
    EXPECT_FALSE(model.sketch->loops);
    EXPECT_DOUBLE_EQ(model.sketch->pole_brightness, 5.0);
    EXPECT_DOUBLE_EQ(model.sketch->plane_height.degrees(), 6);
    EXPECT_EQ(model.sketch->index, -3);
    EXPECT_EQ(model.sketch->seed, 7U);
    EXPECT_FALSE(model.intensity.has_value());
    const std::string start = std::string(head) + "[sketch]\n";
    for (const char* line : {"pole_brightness = \"5 K_CMB\"", "pole_brightness = \"-5 K_RJ\"",
                             "pole_brightness = 5", "texture_rms = -1", "polarized_fraction = 1.1",
                             "seed = -1", "plane_height = \"0 deg\"", "disk = true", "index = \"steep\""})
        EXPECT_TRUE(has(message_of(start + line + "\n"), "m.toml:3:")) << line;
    EXPECT_TRUE(has(message_of(start + "disc = false\nloops = false\n"), "no sky"));
}

TEST(BundledModels, AreAllRightAndSaySoWhenInvented) {
    ASSERT_FALSE(list_bundled_models().empty());
    for (const BundledModel& bundled : list_bundled_models()) {
        const ModelSpec model = read_bundled_model(std::string(bundled.name));
        EXPECT_EQ(model.name, bundled.name);
        EXPECT_TRUE(model.file.empty());
        EXPECT_EQ(model.source, bundled.text);
        if (model.sketch) {
            EXPECT_TRUE(has(model.title, "Invented") && has(model.title, "not a measurement"));
        }
        if (model.galaxy) {
            EXPECT_TRUE(has(model.title, "imulated") && has(model.title, "not the measured sky"));
        }
    }
    EXPECT_NE(find_bundled_model("disc-and-loops"), nullptr);
}

TEST(BundledModels, WriteOutTheDefaultsOfTheSketch) {
    const SketchSpec written = *read_bundled_model("quick-sketch").sketch;
    const SketchSpec defaults;
    EXPECT_EQ(written.pole_brightness, defaults.pole_brightness);
    EXPECT_EQ(written.plane_brightness, defaults.plane_brightness);
    EXPECT_EQ(written.plane_height, defaults.plane_height);
    EXPECT_EQ(written.texture_rms, defaults.texture_rms);
    EXPECT_EQ(written.index, defaults.index);
    EXPECT_EQ(written.index_rms, defaults.index_rms);
    EXPECT_EQ(written.curvature, defaults.curvature);
    EXPECT_EQ(written.curvature_rms, defaults.curvature_rms);
    EXPECT_EQ(written.polarized_fraction, defaults.polarized_fraction);
    EXPECT_EQ(written.seed, defaults.seed);
}

TEST(BundledModels, RefuseUnknownNamesWithTheNearest) {
    try {
        (void)read_bundled_model("disk-and-loops");
        FAIL();
    } catch (const InputError& error) {
        EXPECT_TRUE(has(error.what(), "did you mean 'disc-and-loops'?")) << error.what();
    }
}

}  // namespace
}  // namespace foreglow
