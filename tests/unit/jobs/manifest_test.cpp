// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/manifest.h"

#include <gtest/gtest.h>
#include <unistd.h>

#include <array>

#include "base/build_info.h"
#include "io/hash.h"
#include "io/json_value.h"
#include "support/messages.h"
#include "support/run_folder.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;
using testing::has;
using testing::RunFolder;

const JsonValue& at(const JsonValue& value, const std::string& key) {
    const JsonValue* found = value.find(key);
    EXPECT_NE(found, nullptr) << key;
    static const JsonValue none;
    return found != nullptr ? *found : none;
}
template <class T>
T get(const JsonValue& value, const std::string& key) {
    const T* held = std::get_if<T>(&at(value, key).storage());
    EXPECT_NE(held, nullptr) << key;
    return held != nullptr ? *held : T{};
}

TEST(Manifest, SaysHowTheMapsWereMade) {
    const RunFolder folder;
    folder.write_study("stokes = \"IQU\"\n");
    Progress progress;
    EXPECT_NO_THROW(run_make({folder.request("out", false, {"seed=77"}), true}, progress));
    const JsonValue run = read_json(folder / "out/run.json");
    EXPECT_EQ(*at(run, "title").text(), "Test");
    EXPECT_EQ(*at(run, "version").text(), version());
    EXPECT_EQ(get<std::uint64_t>(run, "seed"), 77U);
    EXPECT_EQ(get<std::uint64_t>(run, "nside"), 8U);
    EXPECT_EQ(*at(at(run, "conventions"), "polarization").text(), "COSMO");
    EXPECT_EQ(*at(at(run, "conventions"), "unit").text(), "K_RJ");
    EXPECT_LE(get<double>(at(run, "accuracy"), "reached"), 1.0001e-4 + 0x1p-24);
    const auto& channels = *at(run, "channels").array();
    ASSERT_EQ(channels.size(), 2U);
    EXPECT_EQ(*at(channels[0], "route").text(), "law in each pixel");
    EXPECT_EQ(*at(channels[1], "route").text(), "a_lm");
    EXPECT_TRUE(has(*at(run, "study").text(), "accuracy = 1e-4"));
    EXPECT_TRUE(has(*at(run, "model").text(), "[polarization]"));
    EXPECT_FALSE(at(run, "timings").array()->empty());
}

TEST(Manifest, ListsInputsAndOutputsWithTheirSums) {
    const RunFolder folder;
    folder.write_study();
    Progress progress;
    run_make({folder.request(), true}, progress);
    const JsonValue run = read_json(folder / "out/run.json");
    std::set<std::string> inputs, outputs;
    for (const JsonValue& file : *at(run, "inputs").array()) {
        inputs.insert(*at(file, "name").text());
        EXPECT_EQ(*at(file, "sha256").text(), sha256_of_file(folder / *at(file, "name").text()));
    }
    EXPECT_EQ(inputs, (std::set<std::string>{"study.toml", "model.toml", "survey.fits", "index.fits"}));
    for (const JsonValue& file : *at(run, "outputs").array()) {
        const std::string name = *at(file, "name").text();
        outputs.insert(name);
        EXPECT_EQ(*at(file, "xxh3_128").text(), xxh3_128_of_file(folder / "out" / name));
        EXPECT_EQ(*at(file, "sha256").text(), sha256_of_file(folder / "out" / name));
        EXPECT_EQ(get<std::uint64_t>(file, "bytes"), fs::file_size(folder / "out" / name));
    }
    outputs.insert("run.json");
    EXPECT_EQ(outputs, folder.files());
    const auto listed = list_manifest_outputs(folder / "out/run.json");
    EXPECT_EQ(listed.size() + 1, outputs.size());
}

// Neither manifest nor report tells of the machine: no folder of any input, wherever it was named, and no
// host.
TEST(Manifest, NamesNoPathOutsideTheRun) {
    const RunFolder folder;
    folder.write_study("stokes = \"IQU\"\n");
    const std::string survey = (folder / "survey.fits").string();
    folder.write("absolute.toml", "reference_frequency = \"408 MHz\"\n[intensity]\nmap = \"" + survey +
                                      "\"\n[polarization]\nmap = '" + survey +
                                      "'\ncolumns = [2, 3]\n[index]\nvalue = -0.8\n");
    Progress progress;
    run_make(
        {folder.request("out", false, {"lmax=24", "model=" + (folder / "absolute.toml").string()}), false},
        progress);
    std::array<char, 256> host{};
    ASSERT_EQ(::gethostname(host.data(), host.size() - 1), 0);
    const std::string base = (folder / "").parent_path().string();
    for (const char* name : {"run.json", "report.html"}) {
        const std::string text = testing::read_whole_file(folder / "out" / name);
        const auto place = text.find(base);
        EXPECT_EQ(place, std::string::npos)
            << name << ": ..."
            << text.substr(place == std::string::npos ? 0 : place - std::min<std::size_t>(place, 80), 200);
        EXPECT_FALSE(has(text, fs::temp_directory_path().string() + "/")) << name;
        EXPECT_FALSE(std::string(host.data()).size() > 3 && has(text, host.data())) << name;
    }
    const JsonValue run = read_json(folder / "out/run.json");
    EXPECT_GE(at(run, "warnings").array()->size(), 2U) << "the warnings are there, without folders";
    EXPECT_TRUE(has(*at(run, "model").text(), "map = \"survey.fits\""));
}

}  // namespace
}  // namespace foreglow
