// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_map_write.h"

#include <fitsio.h>
#include <gtest/gtest.h>
#include <healpix_map.h>
#include <healpix_map_fitsio.h>

#include <cmath>
#include <cstring>
#include <limits>
#include <numeric>

#include "base/error.h"
#include "base/parallel.h"
#include "support/run_command.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

using testing::read_whole_file;
using testing::run_command;
using testing::run_oracle;
using testing::TemporaryFolder;
using Columns = std::vector<std::vector<double>>;
constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Values that differ from pixel to pixel, with every 17th undefined.
Columns make_columns(int nside, std::size_t count) {
    Columns out(count, std::vector<double>(static_cast<std::size_t>(12 * nside * nside)));
    for (std::size_t c = 0; c < count; ++c) {
        for (std::size_t i = 0; i < out[c].size(); ++i) {
            out[c][i] = i % 17 == 5
                            ? nan
                            : (static_cast<double>(c) + 1.1) * std::sin(0.37 * static_cast<double>(i)) * 1e-3;
        }
    }
    return out;
}

std::vector<std::span<const double>> views(const Columns& columns, std::size_t first = 0,
                                           std::size_t count = SIZE_MAX) {
    std::vector<std::span<const double>> out;
    for (const auto& column : columns)
        out.push_back(std::span(column).subspan(first, std::min(count, column.size() - first)));
    return out;
}

FitsMapLayout make_layout(int nside, std::size_t columns) {
    FitsMapLayout layout;
    layout.nside = nside;
    const char* names[] = {"I_STOKES", "Q_STOKES", "U_STOKES"};
    for (std::size_t c = 0; c < columns; ++c)
        layout.columns.push_back({names[c], "uK_CMB"});
    if (columns == 3) layout.convention = PolarizationConvention::Cosmo;
    layout.extname = "CHANNEL low";
    layout.cards = {{"FREQ", 30.5e9, "[Hz] reference frequency"},
                    {"BEAMFWHM", 0.1, "[deg]"},
                    {"KSCALE", std::string("CMB"), "temperature scale"},
                    {"SEED", std::int64_t{20260101}, ""},
                    {"TRUTH", false, ""},
                    {"TITLE", "a long title, d\xc3\xa9j\xc3\xa0 vu, it's " + std::string(120, 'x'), ""},
                    {"HISTORY", std::string("made by a test"), ""}};
    return layout;
}

void expect_same(const std::vector<double>& got, std::size_t offset, const std::vector<double>& want,
                 bool float64) {
    ASSERT_GE(got.size(), offset + want.size());
    for (std::size_t i = 0; i < want.size(); ++i) {
        // One rounding to the file's precision and none else: equality to the bit.
        const double expected = float64 ? want[i] : static_cast<double>(static_cast<float>(want[i]));
        ASSERT_TRUE(std::isnan(expected) ? std::isnan(got[offset + i]) : got[offset + i] == expected)
            << "pixel " << i << ": " << got[offset + i] << " for " << expected;
    }
}

std::vector<double> read_doubles(const std::filesystem::path& path) {
    const std::string bytes = read_whole_file(path);
    std::vector<double> out(bytes.size() / sizeof(double));
    std::memcpy(out.data(), bytes.data(), out.size() * sizeof(double));
    return out;
}

struct Case {
    std::string name;
    FitsMapLayout layout;
    Columns columns;
};

std::vector<Case> make_cases() {
    std::vector<Case> cases;
    for (const int nside : {1, 2, 8, 16, 64}) {
        for (const bool nested : {false, true}) {
            Case one;
            one.layout = make_layout(nside, nside == 2 ? 1 : 3);
            one.layout.ordering = nested ? Ordering::Nested : Ordering::Ring;
            one.layout.float64 = nside == 16 || nside == 1;
            one.layout.frame = nside == 8 ? Frame::Icrs : nside == 64 ? Frame::Ecliptic : Frame::Galactic;
            one.columns = make_columns(nside, one.layout.columns.size());
            one.name = "map" + std::to_string(nside) + (nested ? "n" : "r") + ".fits";
            cases.push_back(one);
            if (nside < 8) continue;
            one.name = "part" + one.name;
            one.layout.pixels.emplace();
            for (std::int64_t p = 3; p < 12LL * nside * nside; p += 7)
                one.layout.pixels->push_back(p);
            const HealpixGrid grid(nside);
            std::vector<bool> listed(static_cast<std::size_t>(grid.npix()));
            for (const auto p : *one.layout.pixels)
                listed[static_cast<std::size_t>(nested ? grid.nested_to_ring(p) : p)] = true;
            for (auto& column : one.columns) {
                for (std::size_t i = 0; i < column.size(); ++i) {
                    if (!listed[i]) column[i] = nan;
                }
            }
            cases.push_back(one);
        }
    }
    return cases;
}

// From outside: healpy 1.16 and astropy 5.2 open each file, astropy verifies the checksums, and neither says
// a word.
TEST(FitsMapWriter, IsReadByHealpyAndAstropyWithEveryValueTheSame) {
    const TemporaryFolder folder;
    const std::vector<Case> cases = make_cases();
    std::vector<std::string> arguments = {folder / "values"};
    for (const auto& one : cases) {
        write_fits_map(folder / one.name, one.layout, views(one.columns));
        arguments.push_back(folder / one.name);
    }
    const auto result = run_oracle("fits_opening.py", arguments);
    ASSERT_EQ(result.status, 0) << result.output;
    const std::vector<double> values = read_doubles(folder / "values");
    std::size_t offset = 0;
    for (const auto& one : cases) {
        SCOPED_TRACE(one.name);
        for (const auto& column : one.columns) {
            expect_same(values, offset, column, one.layout.float64);
            offset += column.size();
        }
    }
    EXPECT_EQ(offset, values.size());
    EXPECT_NE(result.output.find("64 NESTED E I_STOKES,Q_STOKES,U_STOKES uK_CMB,uK_CMB,uK_CMB"),
              std::string::npos)
        << result.output;
    EXPECT_NE(result.output.find("8 RING C I_STOKES,Q_STOKES,U_STOKES -,uK_CMB,uK_CMB,uK_CMB"),
              std::string::npos)
        << result.output;
}

// From outside: fitsverify 4.20 (HEASARC), which counts warnings and errors.
TEST(FitsMapWriter, PassesTheVerifierWithoutAWarning) {
    const TemporaryFolder folder;
    for (const auto& one : make_cases()) {
        write_fits_map(folder / "a.fits", one.layout, views(one.columns));
        // Its file names mean things in brackets, so it is called from the folder.
        const auto result =
            run_command({"/bin/sh", "-c", "cd \"$0\" && exec fitsverify a.fits", folder.path()});
        EXPECT_NE(result.output.find("found 0 warning(s) and 0 error(s)"), std::string::npos)
            << one.name << "\n"
            << result.output;
    }
}

// From outside: HEALPix C++ 3.80's own reader, which knows full-sky maps only.
TEST(FitsMapWriter, IsReadByHealpixItself) {
    const TemporaryFolder folder;
    for (const auto& one : make_cases()) {
        if (one.layout.pixels) continue;
        // It reads meaning into brackets, too.
        const auto old = std::filesystem::current_path();
        std::filesystem::current_path(folder.path());
        write_fits_map("a.fits", one.layout, views(one.columns));
        Healpix_Map<double> map;
        read_Healpix_map_from_fits("a.fits", map, 1, 2);
        std::filesystem::current_path(old);
        EXPECT_EQ(map.Nside(), one.layout.nside);
        ASSERT_EQ(map.Scheme(), one.layout.ordering == Ordering::Ring ? RING : NEST);
        if (map.Scheme() == NEST) map.swap_scheme();
        std::vector<double> values(&map[0], &map[0] + map.Npix());
        for (double& value : values) {
            if (approx(value, Healpix_undef, 1e-7)) value = nan;  // the sentinel as a float32, 6e-8
        }
        expect_same(values, 0, one.columns[0], one.layout.float64);
    }
}

TEST(FitsMapWriter, PutsDownTheCardsOfTheInterfacePage) {
    const TemporaryFolder folder;
    const Columns columns = make_columns(16, 3);
    write_fits_map(folder / "a.fits", make_layout(16, 3), views(columns));
    fitsfile* file = nullptr;
    int status = 0;
    fits_open_diskfile(&file, (folder / "a.fits").c_str(), READONLY, &status);
    fits_movabs_hdu(file, 2, nullptr, &status);
    ASSERT_EQ(status, 0);
    const std::pair<const char*, const char*> wanted[] = {{"PIXTYPE", "'HEALPIX '"},
                                                          {"ORDERING", "'RING    '"},
                                                          {"NSIDE", "16"},
                                                          {"FIRSTPIX", "0"},
                                                          {"LASTPIX", "3071"},
                                                          {"INDXSCHM", "'IMPLICIT'"},
                                                          {"OBJECT", "'FULLSKY '"},
                                                          {"COORDSYS", "'G       '"},
                                                          {"POLCCONV", "'COSMO   '"},
                                                          {"POLAR", "T"},
                                                          {"BAD_DATA", "-1.6375E+30"},
                                                          {"TFORM1", "'1024E   '"},
                                                          {"TTYPE3", "'U_STOKES'"},
                                                          {"TUNIT2", "'uK_CMB  '"},
                                                          {"NAXIS1", "12288"},
                                                          {"NAXIS2", "3"},
                                                          {"FREQ", "3.05E+10"},
                                                          {"BEAMFWHM", "0.1"},
                                                          {"KSCALE", "'CMB     '"},
                                                          {"SEED", "20260101"},
                                                          {"TRUTH", "F"},
                                                          {"EXTNAME", "'CHANNEL low'"},
                                                          {"GRAIN", "0"}};
    for (const auto& [key, value] : wanted) {
        char text[FLEN_VALUE] = {};
        EXPECT_EQ(fits_read_keyword(file, key, text, nullptr, &status), 0) << key;
        EXPECT_STREQ(text, value) << key;
    }
    char date[FLEN_VALUE] = {};
    EXPECT_NE(fits_read_keyword(file, "DATE", date, nullptr, &status), 0);
    status = 0;
    int data_ok = 0, header_ok = 0;
    fits_verify_chksum(file, &data_ok, &header_ok, &status);  // CFITSIO's own sums against ours
    EXPECT_EQ(data_ok, 1);
    EXPECT_EQ(header_ok, 1);
    fits_close_file(file, &status);
}

TEST(FitsMapWriter, WritesADateOnlyFromSourceDateEpoch) {
    const TemporaryFolder folder;
    const Columns columns = make_columns(1, 1);
    ::setenv("SOURCE_DATE_EPOCH", "1700000000", 1);
    write_fits_map(folder / "a.fits", make_layout(1, 1), views(columns));
    EXPECT_NE(read_whole_file(folder / "a.fits").find("DATE    = '2023-11-14T22:13:20'"), std::string::npos);
    ::setenv("SOURCE_DATE_EPOCH", "yesterday", 1);
    EXPECT_THROW(write_fits_map(folder / "b.fits", make_layout(1, 1), views(columns)), InputError);
    ::unsetenv("SOURCE_DATE_EPOCH");
    EXPECT_EQ(folder.names(), std::set<std::string>{"a.fits"});
}

TEST(FitsMapWriter, GivesTheSameBytesInAnyPiecesOrderAndNumberOfThreads) {
    const TemporaryFolder folder;
    for (const auto& one : make_cases()) {
        if (one.layout.ordering == Ordering::Nested && !one.layout.pixels)
            continue;  // pieces are in the file's order
        const HealpixGrid grid(one.layout.nside);
        Columns in_file_order = one.columns;
        std::vector<std::int64_t> pixels(static_cast<std::size_t>(grid.npix()));
        std::iota(pixels.begin(), pixels.end(), 0);
        if (one.layout.ordering == Ordering::Nested) {
            for (std::size_t c = 0; c < in_file_order.size(); ++c) {
                for (const auto p : pixels) {
                    in_file_order[c][static_cast<std::size_t>(p)] =
                        one.columns[c][static_cast<std::size_t>(grid.nested_to_ring(p))];
                }
            }
        }
        write_fits_map(folder / "whole", one.layout, views(one.columns));
        set_thread_count(4);
        FitsMapWriter pieces(folder / "pieces", one.layout), scattered(folder / "scattered", one.layout);
        const std::int64_t odd_length = 1531;  // prime, so that rows are cut everywhere
        parallel_for_blocks(grid.npix(), odd_length, [&](std::int64_t begin, std::int64_t end) {
            pieces.write_pixels(begin, views(in_file_order, static_cast<std::size_t>(begin),
                                             static_cast<std::size_t>(end - begin)));
        });
        pieces.finish();
        parallel_for_blocks(grid.npix(), odd_length, [&](std::int64_t begin, std::int64_t end) {
            // A step that shares no factor with 12 nside^2 visits every pixel once, in wild order.
            std::vector<std::int64_t> numbers;
            Columns values(in_file_order.size());
            for (std::int64_t i = begin; i < end; ++i) {
                numbers.push_back(i * 5 % grid.npix());
                for (std::size_t c = 0; c < values.size(); ++c) {
                    values[c].push_back(in_file_order[c][static_cast<std::size_t>(numbers.back())]);
                }
            }
            scattered.write_pixels_scattered(numbers, views(values));
        });
        scattered.finish();
        set_thread_count(available_processors());
        const std::string whole = read_whole_file(folder / "whole");
        EXPECT_TRUE(read_whole_file(folder / "pieces") == whole) << one.name;
        EXPECT_TRUE(read_whole_file(folder / "scattered") == whole) << one.name;
        EXPECT_EQ(static_cast<std::int64_t>(whole.size()), fits_map_file_bytes(one.layout));
    }
}

TEST(FitsMapWriter, TakesFloatsAsTheyAre) {
    const TemporaryFolder folder;
    const Columns columns = make_columns(16, 1);
    const std::vector<float> floats(columns[0].begin(), columns[0].end());
    write_fits_map(folder / "a", make_layout(16, 1), views(columns));
    FitsMapWriter writer(folder / "b", make_layout(16, 1));
    const std::span<const float> view[] = {floats};
    writer.write_pixels(0, FitsMapWriter::FloatColumns(view));
    writer.finish();
    EXPECT_TRUE(read_whole_file(folder / "a") == read_whole_file(folder / "b"));
}

TEST(FitsMapWriter, LeavesNothingBehindUnlessFinished) {
    const TemporaryFolder folder;
    const Columns columns = make_columns(16, 1);
    { FitsMapWriter writer(folder / "a.fits", make_layout(16, 1)); }
    EXPECT_TRUE(folder.names().empty());
    {
        FitsMapWriter writer(folder / "a.fits", make_layout(16, 1));
        writer.write_pixels(0, views(columns, 0, 1024));
        EXPECT_THROW(writer.finish(), ContractError);  // two thirds are missing
    }
    EXPECT_TRUE(folder.names().empty());
    EXPECT_THROW(FitsMapWriter(folder / "absent/a.fits", make_layout(16, 1)), FileError);
}

TEST(FitsMapWriter, RefusesValuesThatTheFileCannotHold) {
    const TemporaryFolder folder;
    Columns columns = make_columns(16, 1);
    columns[0][2000] = 1e39;  // above the largest float32, 3.4e38
    try {
        write_fits_map(folder / "a.fits", make_layout(16, 1), views(columns));
        FAIL() << "no error";
    } catch (const NumericError& error) {
        EXPECT_EQ(error.what(), "a value for " + (folder / "a.fits").string() +
                                    " is infinite or too large for float32; ask for precision = \"float64\"");
    }
    FitsMapLayout layout = make_layout(16, 1);
    layout.float64 = true;
    write_fits_map(folder / "b.fits", layout, views(columns));
    columns[0][2000] = std::numeric_limits<double>::infinity();
    EXPECT_THROW(write_fits_map(folder / "c.fits", layout, views(columns)), NumericError);
    EXPECT_EQ(folder.names(), std::set<std::string>{"b.fits"});
}

// At nside 8192 offsets pass 32 bits; the file is sparse, so nothing of that size is stored.
TEST(FitsMapWriter, FindsTheLastPixelOfTheLargestMap) {
    const TemporaryFolder folder;
    FitsMapLayout layout = make_layout(8192, 3);
    layout.float64 = true;
    const std::int64_t npix = 12LL * 8192 * 8192;
    FitsMapWriter writer(folder / "a.fits", layout);
    const Columns last = {{1.5}, {2.5}, {-3.5}};
    writer.write_pixels(npix - 1, views(last));
    const std::int64_t bytes = fits_map_file_bytes(layout);
    EXPECT_EQ(static_cast<std::int64_t>(std::filesystem::file_size(folder / "a.fits.part")), bytes);
    EXPECT_GT(bytes, npix * 24);
    std::ifstream in(folder / "a.fits.part", std::ios::binary);
    std::string header(5760 * 2, '\0');
    in.read(header.data(), static_cast<std::streamsize>(header.size()));
    EXPECT_NE(header.find("NAXIS2  =               786432"), std::string::npos);
    EXPECT_NE(header.find("LASTPIX =            805306367"), std::string::npos);
    // U's last cell ends the last row; after it comes padding to a whole block only.
    const std::int64_t header_bytes = bytes - (npix * 24 + 2879) / 2880 * 2880;
    in.seekg(header_bytes + npix * 24 - 8);
    unsigned char cell[8] = {};
    in.read(reinterpret_cast<char*>(cell), 8);
    EXPECT_EQ(cell[0], 0xc0);  // -3.5 is c00c000000000000
    EXPECT_EQ(cell[1], 0x0c);
    in.seekg(header_bytes + npix * 24 - 8 - 1024 * 8);
    in.read(reinterpret_cast<char*>(cell), 8);
    EXPECT_EQ(cell[0], 0x40);  // Q's last cell, 2.5, is 4004000000000000
    EXPECT_EQ(cell[1], 0x04);
}

}  // namespace
}  // namespace foreglow
