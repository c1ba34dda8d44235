// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/study_file.h"

#include <gtest/gtest.h>

#include <fstream>
#include <string>

#include "base/error.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

bool has(const std::string& message, const std::string& part) {
    return message.find(part) != std::string::npos;
}

constexpr const char* head = "model = \"disc-and-loops\"\nnside = 64\n";
constexpr const char* channel = "[[channel]]\nname = \"low\"\nfrequency = \"30 GHz\"\n";

StudySpec make(const std::string& text) {
    return make_study(parse_toml(text, "s.toml"), "s.toml");
}

std::string message_of(const std::string& text) {
    try {
        (void)make(text);
    } catch (const InputError& error) {
        return error.what();
    }
    return "";
}
/// The message for one more line at the top, which is line 3 of the file.
std::string message_of_key(const std::string& line) {
    return message_of(head + line + "\n" + channel);
}
/// The message for one more line in the channel, which is line 6 of the file.
std::string message_of_channel(const std::string& line) {
    return message_of(std::string(head) + channel + line + "\n");
}

TEST(StudyFile, HasTheDefaultsOfTheInterface) {
    const StudySpec study = make(std::string(head) + channel);
    EXPECT_EQ(study.title, "s");
    EXPECT_TRUE(study.model_is_bundled);
    EXPECT_EQ(study.model, "disc-and-loops");
    EXPECT_EQ(study.model_place, "s.toml:1:9");
    EXPECT_EQ(study.nside, 64);
    EXPECT_EQ(study.lmax, 128);
    EXPECT_FALSE(study.polarized);
    EXPECT_EQ(study.unit, BrightnessUnit{});
    EXPECT_EQ(study.precision, MapPrecision::Float32);
    EXPECT_EQ(study.frame, Frame::Galactic);
    EXPECT_EQ(study.ordering, Ordering::Ring);
    EXPECT_EQ(study.convention, PolarizationConvention::Cosmo);
    EXPECT_FALSE(study.remove_monopole);
    EXPECT_FALSE(study.pixel_window);
    EXPECT_FALSE(study.coverage.has_value());
    EXPECT_EQ(study.accuracy, 1e-5);
    EXPECT_EQ(study.seed, 0U);
    EXPECT_EQ(study.realizations, 1);
    EXPECT_EQ(study.truth, TruthLevel::Maps);
    EXPECT_TRUE(study.warnings.empty());
    ASSERT_EQ(study.channels.size(), 1U);
    EXPECT_EQ(study.channels[0].frequency->hz(), 30e9);
    EXPECT_FALSE(study.channels[0].bandwidth.has_value());
    EXPECT_EQ(study.channels[0].response_weights, ResponseWeights::Temperature);
}

TEST(StudyFile, ReadsEveryKey) {
    const StudySpec study = make(R"(title = "T"
model = "disc-and-loops"
nside = 8
stokes = "IQU"
unit = "MJy/sr"
precision = "float64"
frame = "ecliptic"
ordering = "nested"
polarization_convention = "IAU"
monopole = "remove"
pixel_window = true
lmax = 10
accuracy = 1e-7
seed = 9223372036854775807
realizations = 3
truth = "full"
response_weights = "photon"
reference_flux_index = -1
[[channel]]
name = "a"
frequency = "30 GHz"
bandwidth = "6 GHz"
beam_fwhm = "33 arcmin"
noise = "5 uK_CMB arcmin"
[[channel]]
name = "b"
frequency = "40 GHz"
response_weights = "radiance"
reference_flux_index = 2.5
)");
    EXPECT_EQ(study.title, "T");
    EXPECT_TRUE(study.polarized);
    EXPECT_EQ(study.unit.kind, BrightnessUnit::Kind::MegajanskyPerSteradian);
    EXPECT_EQ(study.precision, MapPrecision::Float64);
    EXPECT_EQ(study.frame, Frame::Ecliptic);
    EXPECT_EQ(study.ordering, Ordering::Nested);
    EXPECT_EQ(study.convention, PolarizationConvention::Iau);
    EXPECT_TRUE(study.remove_monopole);
    EXPECT_TRUE(study.pixel_window);
    EXPECT_EQ(study.lmax, 10);
    EXPECT_EQ(study.accuracy, 1e-7);
    EXPECT_EQ(study.seed, 9223372036854775807U);
    EXPECT_EQ(study.realizations, 3);
    EXPECT_EQ(study.truth, TruthLevel::Full);
    EXPECT_EQ(study.channels[0].bandwidth->hz(), 6e9);
    EXPECT_DOUBLE_EQ(study.channels[0].beam_fwhm->arcmin(), 33);
    EXPECT_EQ(study.channels[0].noise, "5 uK_CMB arcmin");
    EXPECT_EQ(study.channels[0].response_weights, ResponseWeights::Photon);
    EXPECT_EQ(study.channels[0].reference_flux_index, -1);
    EXPECT_EQ(study.channels[1].response_weights, ResponseWeights::Radiance);
    EXPECT_EQ(study.channels[1].reference_flux_index, 2.5);
}

TEST(StudyFile, RefusesWrongKeysOfTheStudyAtTheirPlace) {
    for (const char* line : {"stokes = \"QU\"",
                             "stokes = 3",
                             "unit = \"K\"",
                             "unit = \"uk_cmb\"",
                             "precision = \"double\"",
                             "frame = \"G\"",
                             "ordering = \"spiral\"",
                             "polarization_convention = \"none\"",
                             "monopole = true",
                             "coverage = \"none.fits\"",
                             "pixel_window = 1",
                             "lmax = 257",
                             "lmax = 0",
                             "lmax = 12.5",
                             "accuracy = 1e-9",
                             "accuracy = 0.1",
                             "accuracy = nan",
                             "accuracy = \"high\"",
                             "seed = -1",
                             "seed = 1.5",
                             "realizations = 0",
                             "truth = \"some\"",
                             "truth = 1",
                             "response_weights = \"energy\"",
                             "reference_flux_index = inf",
                             "title = 5",
                             "channels = 1",
                             "channel_grid = 3"}) {
        const std::string message = message_of_key(line);
        EXPECT_EQ(message.substr(0, 9), "s.toml:3:") << line << " -> " << message;
        EXPECT_EQ(message.find('\n'), std::string::npos) << line;
    }
}

TEST(StudyFile, RefusesWrongNsidesAndNamesTheNearest) {
    const auto message_of_nside = [](const std::string& nside) {
        return message_of("model = \"disc-and-loops\"\nnside = " + nside + "\n" + channel);
    };
    EXPECT_TRUE(has(message_of_nside("100"), "the nearest are 64 and 128"));
    EXPECT_TRUE(has(message_of_nside("0"), "1 to 8192"));
    EXPECT_TRUE(has(message_of_nside("-64"), "1 to 8192"));
    EXPECT_TRUE(has(message_of_nside("8191"), "the nearest are 4096 and 8192"));
    // One map at nside 16384: 12 x 16384^2 x 8 bytes = 24 GiB.
    EXPECT_TRUE(has(message_of_nside("16384"), "24.0 GiB"));
    EXPECT_TRUE(has(message_of_nside("9223372036854775807"), "at most 8192"));
    EXPECT_TRUE(has(message_of_nside("64.0"), "whole number"));
    EXPECT_EQ(message_of_nside("1"), "");
    EXPECT_EQ(message_of_nside("8192"), "");
}

TEST(StudyFile, WarnsOfLmaxAboveTwoAndAHalfNside) {
    EXPECT_TRUE(make(std::string(head) + "lmax = 160\n" + channel).warnings.empty());
    const StudySpec study = make(std::string(head) + "lmax = 161\n" + channel);
    ASSERT_EQ(study.warnings.size(), 1U);
    EXPECT_TRUE(has(study.warnings[0], "2.5 nside = 160"));
    EXPECT_EQ(make(std::string(head) + "lmax = 256\n" + channel).lmax, 256);
}

TEST(StudyFile, RefusesWrongChannelsAtTheirPlace) {
    for (const char* line :
         {"bandwidth = \"60 GHz\"", "bandwidth = \"-1 GHz\"", "bandwidth = 6", "beam_fwhm = \"0 deg\"",
          "beam_fwhm = \"181 deg\"", "beam_fwhm = \"33 GHz\"", "response = \"none.csv\"",
          "beam_window = \"none.csv\"", "noise = \"5\"", "noise = \"5 uK_CMB\"", "noise = \"5 uK arcmin\"",
          "noise = \"-5 uK_CMB arcmin\"", "noise = \"5 arcmin uK_CMB\"", "frequncy = \"1 GHz\"",
          "response_weights = 1", "reference_flux_index = \"0\""}) {
        const std::string message = message_of_channel(line);
        EXPECT_EQ(message.substr(0, 9), "s.toml:6:") << line << " -> " << message;
        EXPECT_TRUE(has(message, "[[channel]] 'low'")) << message;
    }
}

TEST(StudyFile, AsksForWhatIsMissing) {
    EXPECT_TRUE(has(message_of(std::string("nside = 64\n") + channel), "'model' is missing"));
    EXPECT_TRUE(has(message_of(std::string("model = \"disc-and-loops\"\n") + channel), "'nside' is missing"));
    EXPECT_TRUE(has(message_of(head), "no channel"));
    EXPECT_TRUE(has(message_of(std::string(head) + "channel = []\n"), "no channel"));
    const std::string no_name = message_of(std::string(head) + "[[channel]]\nfrequency = \"30 GHz\"\n");
    EXPECT_TRUE(has(no_name, "s.toml:3:1: 'name' is missing in [[channel]]")) << no_name;
    const std::string no_frequency = message_of(std::string(head) + "[[channel]]\nname = \"a\"\n");
    EXPECT_TRUE(has(no_frequency, "s.toml:3:1: 'frequency' is missing in [[channel]] 'a'")) << no_frequency;
    EXPECT_TRUE(has(message_of(""), "s.toml:1:1: "));
}

TEST(StudyFile, ChecksNamesAsFileStems) {
    const auto message_of_name = [](const std::string& name) {
        return message_of(std::string(head) + "[[channel]]\nname = \"" + name +
                          "\"\nfrequency = \"30 GHz\"\n");
    };
    for (const char* name : {"", ".hidden", "..", "a/b", "a b", "caf\xc3\xa9", "a\\\\b"})
        EXPECT_EQ(message_of_name(name).substr(0, 9), "s.toml:4:") << name;
    EXPECT_EQ(message_of_name(std::string(100, 'a')), "");
    EXPECT_TRUE(has(message_of_name(std::string(101, 'a')), "101 characters"));
    EXPECT_EQ(message_of_name("A-1_b.c"), "");
    const std::string twice =
        message_of(std::string(head) + channel + "[[channel]]\nname = \"LOW\"\nfrequency = \"1 GHz\"\n");
    EXPECT_EQ(twice.substr(0, 9), "s.toml:6:");
    EXPECT_TRUE(has(twice, "upper and lower case"));
}

TEST(StudyFile, ReadsPatches) {
    const std::string start = std::string(head) + channel;
    const StudySpec study = make(start +
                                 "[[patch]]\nname = \"deep\"\ncenter = [83.0, -41]\nsize = \"9 deg\"\n"
                                 "pixel = \"0.5 arcmin\"\n");
    ASSERT_EQ(study.patches.size(), 1U);
    EXPECT_EQ(study.patches[0].name, "deep");
    EXPECT_EQ(study.patches[0].pixels, 1080);
    EXPECT_NEAR(study.patches[0].latitude.degrees(), -41, 1e-12);
    EXPECT_TRUE(has(message_of(start + "[[patch]]\nname = \"x\"\n"), "'center' is missing"));
    EXPECT_TRUE(has(message_of(start + "[[patch]]\nname = \"x\"\ncenter = [1]\n"), "longitude and latitude"));
}

TEST(StudyFile, NamesTheNearestModel) {
    const std::string message = message_of(std::string("model = \"disc-and-loop\"\nnside = 64\n") + channel);
    EXPECT_TRUE(has(message, "s.toml:1:9: ")) << message;
    EXPECT_TRUE(has(message, "did you mean \"disc-and-loops\"")) << message;
}

class StudyOnDisk : public ::testing::Test {
  protected:
    void write(const std::string& name, const std::string& text) { std::ofstream(folder_ / name) << text; }

    testing::TemporaryFolder folder_;
};

TEST_F(StudyOnDisk, TakesPathsRelativeToTheFile) {
    write("model.toml", "");
    write("low.csv", "");
    write("bl.csv", "");
    write("cover.fits", "");
    write("s.toml",
          "model = \"model.toml\"\nnside = 64\ncoverage = \"cover.fits\"\n[[channel]]\nname = \"low\"\n"
          "response = \"low.csv\"\nbeam_window = \"bl.csv\"\n");
    const StudySpec study = read_study(folder_ / "s.toml");
    EXPECT_FALSE(study.model_is_bundled);
    EXPECT_EQ(study.model, (folder_ / "model.toml").string());
    EXPECT_EQ(study.coverage, folder_ / "cover.fits");
    EXPECT_EQ(study.coverage_place, (folder_ / "s.toml").string() + ":3:12");
    EXPECT_EQ(study.channels[0].response, folder_ / "low.csv");
    EXPECT_EQ(study.channels[0].beam_window, folder_ / "bl.csv");
    EXPECT_FALSE(study.channels[0].frequency.has_value());
}

TEST_F(StudyOnDisk, RefusesKeysThatContradictEachOther) {
    write("low.csv", "");
    const auto message_of_lines = [this](const std::string& lines) {
        write("s.toml", std::string(head) + "[[channel]]\nname = \"low\"\n" + lines);
        try {
            (void)read_study(folder_ / "s.toml");
        } catch (const InputError& error) {
            return std::string(error.what());
        }
        return std::string();
    };
    EXPECT_TRUE(
        has(message_of_lines("frequency = \"30 GHz\"\nbandwidth = \"1 GHz\"\nresponse = \"low.csv\"\n"),
            ":7:12: 'response' in [[channel]] 'low' contradicts 'bandwidth'"));
    EXPECT_TRUE(
        has(message_of_lines("frequency = \"30 GHz\"\nbeam_fwhm = \"1 deg\"\nbeam_window = \"low.csv\"\n"),
            "contradicts 'beam_fwhm'"));
    EXPECT_TRUE(has(message_of_lines("bandwidth = \"1 GHz\"\n"), "needs a 'frequency'"));
}

TEST_F(StudyOnDisk, TakesOverridesAndKeepsThemInTheSource) {
    write("s.toml", std::string(head) + channel);
    const StudySpec study =
        read_study(folder_ / "s.toml", {"nside=128", "channel.low.bandwidth=2 GHz", "stokes=IQU"});
    EXPECT_EQ(study.nside, 128);
    EXPECT_EQ(study.lmax, 256);
    EXPECT_TRUE(study.polarized);
    EXPECT_EQ(study.channels[0].bandwidth->hz(), 2e9);
    EXPECT_EQ(study.source,
              std::string(head) + channel +
                  "# --set nside=128\n# --set channel.low.bandwidth=2 GHz\n# --set stokes=IQU\n");
    try {
        (void)read_study(folder_ / "s.toml", {"nside=100"});
        FAIL();
    } catch (const InputError& error) {
        EXPECT_EQ(std::string(error.what()).find("--set nside=100: 'nside' must be a power of two"), 0U)
            << error.what();
    }
    EXPECT_THROW((void)read_study(folder_ / "s.toml", {"nsid=100"}), InputError);
    EXPECT_THROW((void)read_study(folder_ / "none.toml"), InputError);
    EXPECT_THROW((void)read_study(folder_.path()), InputError);
}

TEST_F(StudyOnDisk, DemoStudyIsRight) {
    const StudySpec study =
        read_study(std::filesystem::path(FOREGLOW_SOURCE_DIR) / "data-demo" / "ridge-array.toml");
    EXPECT_EQ(study.channels.size(), 6U);
    EXPECT_TRUE(study.polarized);
    EXPECT_TRUE(study.warnings.empty());
}

TEST(StudyOptions, MakeTheStudyThatTheirSourceSays) {
    StudyOptions options;
    options.model = "disc-and-loops";
    options.frequencies = {"70 GHz", "408 MHz", "1.42GHz"};
    options.nside = 64;
    options.unit = "uK_CMB";
    options.stokes = "IQU";
    options.beam_fwhm = "40 arcmin";
    options.seed = 5;
    options.accuracy = 1e-6;
    options.truth = "false";
    options.overrides = {"channel.70GHz.bandwidth=10 GHz"};
    const StudySpec study = make_study_from_options(options);
    ASSERT_EQ(study.channels.size(), 3U);
    EXPECT_EQ(study.channels[0].name, "70GHz");
    EXPECT_EQ(study.channels[1].name, "408MHz");
    EXPECT_EQ(study.channels[2].name, "1.42GHz");
    EXPECT_EQ(study.channels[0].bandwidth->hz(), 10e9);
    EXPECT_DOUBLE_EQ(study.channels[1].beam_fwhm->arcmin(), 40);
    EXPECT_EQ(study.truth, TruthLevel::None);
    const StudySpec again = make(study.source);  // but for the override, which stands there as a comment
    EXPECT_EQ(again.nside, 64);
    EXPECT_EQ(again.unit, study.unit);
    EXPECT_EQ(again.accuracy, 1e-6);
    EXPECT_EQ(again.channels[2].frequency, study.channels[2].frequency);
    EXPECT_EQ(again.title, study.title);
}

TEST(StudyOptions, NameTheOptionThatIsWrong) {
    const auto message_of_options = [](const StudyOptions& options) {
        try {
            (void)make_study_from_options(options);
        } catch (const InputError& error) {
            return std::string(error.what());
        }
        return std::string();
    };
    StudyOptions right;
    right.model = "disc-and-loops";
    right.frequencies = {"70 GHz"};
    right.nside = 64;
    EXPECT_EQ(message_of_options(right), "");
    StudyOptions wrong = right;
    wrong.nside = 100;
    EXPECT_EQ(message_of_options(wrong).find("--nside 100: "), 0U) << message_of_options(wrong);
    wrong = right;
    wrong.frequencies = {"70"};
    EXPECT_EQ(message_of_options(wrong).find("--frequency \"70\": "), 0U) << message_of_options(wrong);
    wrong = right;
    wrong.frequencies = {"70 GHz", "70000 MHz"};
    EXPECT_TRUE(has(message_of_options(wrong), "'70GHz' is already that of")) << message_of_options(wrong);
    wrong = right;
    wrong.beam_fwhm = "wide";
    EXPECT_TRUE(has(message_of_options(wrong), "--beam-fwhm")) << message_of_options(wrong);
    wrong = right;
    wrong.frequencies.clear();
    EXPECT_TRUE(has(message_of_options(wrong), "--frequency")) << message_of_options(wrong);
    wrong = right;
    wrong.nside.reset();
    EXPECT_TRUE(has(message_of_options(wrong), "--nside")) << message_of_options(wrong);
    wrong = right;
    wrong.model = "";
    EXPECT_TRUE(has(message_of_options(wrong), "--model")) << message_of_options(wrong);
}

}  // namespace
}  // namespace foreglow
