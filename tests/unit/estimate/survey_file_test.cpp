// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/survey_file.h"

#include <gtest/gtest.h>

#include "base/error.h"
#include "support/messages.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

using testing::has;
using testing::message_of;

class SurveyFile : public ::testing::Test {
  protected:
    SurveyFile() {
        for (const char* name : {"a.fits", "b.fits", "n.fits"})
            testing::write_whole_file(folder_ / name, "");
    }
    [[nodiscard]] SurveysSpec make(const std::string& text) const {
        return make_surveys(text, folder_ / "surveys.toml");
    }
    [[nodiscard]] std::string refusal(const std::string& text) const {
        return message_of<InputError>([&] { return make(text); });
    }
    const std::string top_ = "reference_frequency = \"1 GHz\"\nnside = 64\nbeam_fwhm = \"1 deg\"\n";
    const std::string a_ =
        "[[survey]]\nmap = \"a.fits\"\nfrequency = \"1.4 GHz\"\nbeam_fwhm = \"51 arcmin\"\nnoise = \"0.3 "
        "K_RJ\"\n";
    const std::string b_ =
        "[[survey]]\nmap = \"b.fits\"\nfrequency = \"408 MHz\"\nbeam_fwhm = \"1 deg\"\nnoise_map = "
        "\"n.fits\"\n";
    testing::TemporaryFolder folder_;
};

TEST_F(SurveyFile, ReadsEveryKey) {
    const SurveysSpec spec =
        make(top_ + "title = \"T\"\nframe = \"icrs\"\nfit_zero_levels = true\nscatter_nside = 2\n" + a_ +
             "calibration_error = 0.05\nzero_level = \"3 K_RJ\"\nzero_level_error = \"1 K_RJ\"\ncolumn = 2\n"
             "unit = \"K_RJ\"\n" +
             b_);
    EXPECT_EQ(spec.title, "T");
    EXPECT_EQ(spec.frame, Frame::Icrs);
    EXPECT_TRUE(spec.fit_zero_levels);
    EXPECT_FALSE(spec.curvature);
    EXPECT_EQ(spec.scatter_nside, 2);
    ASSERT_EQ(spec.surveys.size(), 2U);
    EXPECT_LT(spec.surveys[0].frequency, spec.surveys[1].frequency);  // ascending, whatever the file's order
    EXPECT_TRUE(spec.surveys[0].noise_map.has_value());
    const SurveySpec& a = spec.surveys[1];
    EXPECT_EQ(a.calibration_error, 0.05);
    EXPECT_EQ(a.zero_level->value, 3);
    EXPECT_EQ(a.zero_level_error->value, 1);
    EXPECT_EQ(std::get<int>(a.map.columns.at(0)), 2);
}

TEST_F(SurveyFile, HasDefaults) {
    const SurveysSpec spec = make(top_ + a_ + b_);
    EXPECT_EQ(spec.title, "surveys");
    EXPECT_EQ(spec.frame, Frame::Galactic);
    EXPECT_EQ(spec.scatter_nside, 4);
    EXPECT_EQ(spec.surveys[0].calibration_error, 0);
}

TEST_F(SurveyFile, RefusesWhatCannotBe) {
    EXPECT_TRUE(has(refusal(top_ + a_), "2 different frequencies"));
    EXPECT_TRUE(has(refusal(top_ + a_ + a_), "2 different frequencies"));
    EXPECT_TRUE(has(refusal(top_ + "curvature = true\n" + a_ + b_), "3 different frequencies"));
    EXPECT_TRUE(
        has(refusal("reference_frequency = \"1 GHz\"\nnside = 64\nbeam_fwhm = \"55 arcmin\"\n" + a_ + b_),
            "wider than the common one"));
    EXPECT_TRUE(has(refusal(top_ + "fit_zero_levels = true\n" + a_ + b_), "zero_level_error"));
    EXPECT_TRUE(has(refusal(top_ + a_ + b_ + "noise = \"1 K_RJ\"\n"), "contradicts 'noise'"));
    EXPECT_TRUE(has(refusal(top_ + a_ + b_ + "nois = 1\n"), "'noise'"));
    EXPECT_TRUE(has(refusal(top_ + "scatter_nside = 128\n" + a_ + b_), "scatter_nside"));
    EXPECT_TRUE(has(refusal("nside = 64\nbeam_fwhm = \"1 deg\"\n" + a_ + b_), "reference_frequency"));
    const std::string where = refusal(top_ + a_ + b_ + "calibration_error = -1\n");
    EXPECT_TRUE(has(where, "surveys.toml:14:")) << where;
}

TEST_F(SurveyFile, RefusesMoreSurveysThanAFitTakes) {
    std::string text = top_ + b_;
    for (std::size_t i = 0; i < most_surveys; ++i)
        text += a_;
    EXPECT_TRUE(has(refusal(text), "at most 16"));
}

}  // namespace
}  // namespace foreglow
