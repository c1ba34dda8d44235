// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_cache.h"

#include <gtest/gtest.h>

#include <atomic>
#include <cmath>
#include <cstdlib>
#include <fstream>
#include <limits>
#include <thread>

#include "base/error.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;
using testing::TemporaryFolder;
using testing::write_whole_file;

CachedGalaxy make_entry(double first) {
    CachedGalaxy entry;
    entry.maps = {{first, -0.0, 1e-300}, {std::numeric_limits<double>::quiet_NaN(), 2.0 / 3, 1e300}};
    entry.sampling = {128, 48, 0.1 / 3};
    entry.coarse_pixels = 5;
    return entry;
}

TEST(GalaxyCache, GivesBackWhatWasWrittenToTheLastBit) {
    const TemporaryFolder folder;
    const GalaxyCache cache((folder / "deep") / "cache");
    EXPECT_FALSE(cache.read("a\nb=1\n").has_value());
    cache.write("a\nb=1\n", make_entry(1.0 / 3));
    const auto found = cache.read("a\nb=1\n");
    ASSERT_TRUE(found.has_value());
    EXPECT_EQ(found->maps[0], make_entry(1.0 / 3).maps[0]);
    EXPECT_TRUE(std::isnan(found->maps[1][0]));
    EXPECT_EQ(found->sampling.steps_near_plane, 128U);
    EXPECT_EQ(found->sampling.steps_elsewhere, 48U);
    EXPECT_EQ(found->sampling.error, 0.1 / 3);
    EXPECT_EQ(found->coarse_pixels, 5);
    EXPECT_FALSE(cache.read("a\nb=2\n").has_value());
}

TEST(GalaxyCache, ABrokenEntryIsAbsent) {
    const TemporaryFolder folder;
    const GalaxyCache cache(folder.path());
    cache.write("key", make_entry(7));
    const fs::path file = cache.file_of("key");
    std::string bytes;
    {
        std::ifstream in(file, std::ios::binary);
        bytes.assign(std::istreambuf_iterator<char>(in), {});
    }
    for (std::size_t at = 0; at < bytes.size(); at += 3) {
        std::string broken = bytes;
        broken[at] = static_cast<char>(broken[at] ^ 0x10);
        write_whole_file(file, broken);
        const auto found = cache.read("key");
        // Only the sampling's own numbers can be other ones without a sign of it.
        if (!found) continue;
        EXPECT_EQ(found->maps[0], make_entry(7).maps[0]) << at;
    }
    for (const std::size_t length : {std::size_t{0}, bytes.size() / 2, bytes.size() - 1}) {
        write_whole_file(file, bytes.substr(0, length));
        EXPECT_FALSE(cache.read("key").has_value()) << length;
    }
    write_whole_file(file, bytes + "x");
    EXPECT_FALSE(cache.read("key").has_value());
    cache.write("key", make_entry(8));
    EXPECT_EQ(cache.read("key")->maps[0][0], 8);
}

TEST(GalaxyCache, TwoAtOnceDoNotDisturbOneAnother) {
    const TemporaryFolder folder;
    const GalaxyCache cache(folder.path());
    cache.write("key", make_entry(1));
    std::atomic<int> broken{0};
    std::thread reader([&] {
        for (int i = 0; i < 300; ++i)
            if (!cache.read("key")) ++broken;
    });
    for (int i = 0; i < 20; ++i)
        cache.write("key", make_entry(1));
    reader.join();
    EXPECT_EQ(broken, 0);
    EXPECT_EQ(folder.names().size(), 1U);  // nothing is left beside it
}

TEST(GalaxyCache, IsMeasuredAndClearedWithoutTouchingOtherFiles) {
    const TemporaryFolder folder;
    const GalaxyCache cache(folder.path());
    EXPECT_EQ(measure_cache(folder / "none").entries, 0);
    cache.write("one", make_entry(1));
    cache.write("two", make_entry(2));
    write_whole_file(folder / "galaxy-notes.txt", "mine");
    const CacheSize size = measure_cache(folder.path());
    EXPECT_EQ(size.entries, 2);
    EXPECT_EQ(size.bytes, fs::file_size(cache.file_of("one")) + fs::file_size(cache.file_of("two")));
    EXPECT_EQ(clear_cache(folder.path()).entries, 2);
    EXPECT_EQ(folder.names(), std::set<std::string>{"galaxy-notes.txt"});
}

TEST(GalaxyCache, SaysWhyItCannotBeWritten) {
    const TemporaryFolder folder;
    write_whole_file(folder / "file", "");
    EXPECT_THROW(GalaxyCache(folder / "file").write("key", make_entry(1)), FileError);
}

TEST(GalaxyCache, DefaultFollowsTheEnvironment) {
    ::setenv("XDG_CACHE_HOME", "/somewhere", 1);
    EXPECT_EQ(default_cache_folder(), fs::path("/somewhere/foreglow"));
    ::setenv("XDG_CACHE_HOME", "relative", 1);  // the specification says that these are to be ignored
    ::setenv("HOME", "/people/someone", 1);
    EXPECT_EQ(default_cache_folder(), fs::path("/people/someone/.cache/foreglow"));
    ::unsetenv("XDG_CACHE_HOME");
    ::unsetenv("HOME");
    EXPECT_FALSE(default_cache_folder().has_value());
}

}  // namespace
}  // namespace foreglow
