// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/start.h"

#include <gtest/gtest.h>

#include <string>
#include <vector>

#include "base/error.h"
#include "base/text.h"
#include "model/model_file.h"
#include "model/study_file.h"
#include "support/fits_builder.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

using testing::FitsMapBuilder;
using testing::TemporaryFolder;

bool has(const std::string& text, const std::string& part) {
    return text.find(part) != std::string::npos;
}

/// Takes the "#? " off every question, as a user who agrees with the example does.
std::string answered(const std::string& text) {
    std::string out;
    for (const std::string& line : split(text, '\n'))
        out += (line.starts_with("#? ") ? line.substr(3) : line) + "\n";
    return out;
}

FitsMapBuilder survey() {
    FitsMapBuilder map(1);
    map.column("I_STOKES", "1E", std::vector<double>(12, 5.0), "K_RJ");
    map.column("Q_STOKES", "1E", std::vector<double>(12, 1.0), "K_RJ");
    map.column("U_STOKES", "1E", std::vector<double>(12, 0.5), "K_RJ");
    return map;
}

TEST(StartStudy, IsAStudyAsItStands) {
    const StudySpec study = make_study(parse_toml(make_start_study(), "start.toml"), "start.toml");
    EXPECT_EQ(study.channels.size(), 2U);
    EXPECT_TRUE(study.warnings.empty());
}

TEST(StartStudy, OffersOnlyKeysThatThereAre) {
    std::vector<std::string> lines = split(make_start_study(), '\n');
    int offered = 0;
    bool in_grid = false;
    for (std::size_t i = 0; i < lines.size(); ++i) {
        in_grid = in_grid || lines[i] == "# [channel_grid]";
        if (in_grid || !lines[i].starts_with("# ") || !has(lines[i], " = ")) continue;
        ++offered;
        std::vector<std::string> with = lines;
        with[i] = lines[i].substr(2);
        std::string text;
        for (const std::string& line : with)
            text += line + "\n";
        try {
            (void)make_study(parse_toml(text, "start.toml"), "start.toml");
        } catch (const InputError& error) {
            // The files in the examples are not there, which is another matter than the key.
            EXPECT_TRUE(has(error.what(), "does not exist")) << error.what();
        }
    }
    EXPECT_EQ(offered, 16);  // 13 of the study, 3 of its first channel
}

TEST(StartStudy, OffersAGridThatIsRight) {
    std::string text;
    bool in_grid = false;
    for (const std::string& line : split(make_start_study(), '\n')) {
        in_grid = in_grid || line == "# [channel_grid]";
        text += (in_grid && line.starts_with("# ") ? line.substr(2) : line) + "\n";
    }
    EXPECT_EQ(make_study(parse_toml(text, "start.toml"), "start.toml").channels.size(), 18U);
}

TEST(StartModel, AsksNothingThatTheHeaderSays) {
    const TemporaryFolder folder;
    survey().card("POLCCONV", "'IAU     '").card("FREQ", "408000000.0").write(folder / "survey.fits");
    StartRequest request;
    request.model_for = folder / "survey.fits";
    const StartResult result = run_start(request);
    EXPECT_EQ(result.questions, 0);
    EXPECT_FALSE(has(result.text, "#?"));
    const ModelSpec model = make_model(result.text, "model.toml", "model");
    EXPECT_DOUBLE_EQ(model.reference_frequency.hz(), 408e6);
    EXPECT_EQ(model.intensity->map.path, folder / "survey.fits");
    EXPECT_EQ(std::get<int>(model.intensity->map.columns.at(0)), 1);
    EXPECT_EQ(std::get<int>(model.polarization->map->columns.at(0)), 2);
    EXPECT_EQ(std::get<int>(model.polarization->map->columns.at(1)), 3);
}

TEST(StartModel, AsksWhatTheHeaderLeavesOpenAndIsRightOnceAnswered) {
    const TemporaryFolder folder;
    FitsMapBuilder map(1);
    map.column("TEMPERATURE", "1E", std::vector<double>(12, 5.0), "mK");
    map.column("Q-POLARISATION", "1E", std::vector<double>(12, 1.0));
    map.column("U-POLARISATION", "1E", std::vector<double>(12, 1.0));
    map.without("COORDSYS").without("ORDERING").card("FREQ", "61.0").write(folder / "survey.fits");
    StartRequest request;
    request.model_for = folder / "survey.fits";
    const StartResult result = run_start(request);
    EXPECT_EQ(result.questions, 5);  // frequency, ordering, frame, unit, convention
    for (const char* question : {"#? reference_frequency", "#? ordering", "#? frame", "#? unit = \"mK_RJ\"",
                                 "#? polarization_convention", "FREQ = 61", "the header says 'mK'"})
        EXPECT_TRUE(has(result.text, question)) << question << "\n" << result.text;
    EXPECT_THROW((void)make_model(result.text, "model.toml", "model"), InputError);  // the frequency is open
    const ModelSpec model = make_model(answered(result.text), "model.toml", "model");
    EXPECT_EQ(model.intensity->map.unit->scale, 1e-3);
    EXPECT_EQ(model.intensity->map.frame, Frame::Galactic);
    EXPECT_EQ(model.polarization->map->convention, PolarizationConvention::Cosmo);
}

TEST(StartModel, OffersOnlyKeysThatThereAre) {
    const TemporaryFolder folder;
    survey().write(folder / "survey.fits");
    StartRequest request;
    request.model_for = folder / "survey.fits";
    std::string text;
    for (const std::string& line : split(answered(run_start(request).text), '\n')) {
        const bool offers = line.starts_with("# ") && (has(line, " = ") || line == "# [curvature]") &&
                            !has(line, "map = \"index");
        text += (offers ? line.substr(2) : line) + "\n";
    }
    EXPECT_TRUE(has(text, "\nzero_level = ")) << text;
    const ModelSpec model = make_model(text, "model.toml", "model");
    EXPECT_TRUE(model.intensity->zero_level.has_value());
    EXPECT_TRUE(model.intensity->beam_fwhm.has_value());
    EXPECT_TRUE(model.polarization->index.has_value());
    EXPECT_EQ(std::get<double>(model.curvature), -0.04);
}

TEST(Start, WritesAFileButNeverOverOne) {
    const TemporaryFolder folder;
    StartRequest request;
    request.output = folder / "study.toml";
    EXPECT_EQ(run_start(request).text, make_start_study());
    EXPECT_EQ(testing::read_whole_file(folder / "study.toml"), make_start_study());
    EXPECT_THROW((void)run_start(request), InputError);
    request.output = folder.path() / "none" / "study.toml";
    EXPECT_THROW((void)run_start(request), InputError);
    request.output = folder / "model.toml";
    request.model_for = folder / "none.fits";
    EXPECT_THROW((void)run_start(request), InputError);
    EXPECT_EQ(folder.names(), std::set<std::string>{"study.toml"});
}

TEST(Start, WritesThePathOfTheMapAsSeenFromTheModel) {
    const TemporaryFolder folder;
    std::filesystem::create_directories(folder / "maps");
    std::filesystem::create_directories(folder / "models");
    survey()
        .card("FREQ", "408000000.0")
        .card("POLCCONV", "'COSMO   '")
        .write(folder.path() / "maps" / "s.fits");
    const std::filesystem::path here = std::filesystem::current_path();
    std::filesystem::current_path(folder.path());
    StartRequest request;
    request.model_for = "maps/s.fits";
    request.output = "models/s.toml";
    const std::string text = run_start(request).text;
    std::filesystem::current_path(here);
    EXPECT_TRUE(has(text, "map = \"../maps/s.fits\"")) << text;
    EXPECT_NO_THROW((void)read_model(folder.path() / "models" / "s.toml"));
}

}  // namespace
}  // namespace foreglow
