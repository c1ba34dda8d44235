// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_map_read.h"

#include <fitsio.h>
#include <gtest/gtest.h>

#include <cmath>
#include <cstring>
#include <limits>

#include "base/error.h"
#include "base/parallel.h"
#include "support/fits_builder.h"
#include "support/run_command.h"

namespace foreglow {
namespace {

using testing::FitsMapBuilder;
using testing::read_whole_file;
using testing::run_oracle;
using testing::TemporaryFolder;
using testing::write_whole_file;
using Values = std::vector<double>;
constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double inf = std::numeric_limits<double>::infinity();

/// Puts a text between the quotes of a FITS card.
std::string card_text(const std::string& text) {
    std::string out;
    return out.append(1, '\'').append(text).append(1, '\'');
}

Values ramp(std::size_t count, double first = 0, double step = 1) {
    Values out(count);
    for (std::size_t i = 0; i < count; ++i)
        out[i] = first + step * static_cast<double>(i);
    return out;
}

FitsMapRequest request_of(const std::filesystem::path& path,
                          std::vector<std::variant<int, std::string>> columns = {}) {
    FitsMapRequest request;
    request.path = path;
    request.columns = std::move(columns);
    return request;
}

FitsMap read_built(const FitsMapBuilder& builder, std::vector<std::variant<int, std::string>> columns = {}) {
    const TemporaryFolder folder;
    builder.write(folder / "map.fits");
    return read_fits_map(request_of(folder / "map.fits", std::move(columns)));
}

void expect_same(const Values& got, const Values& want) {
    ASSERT_EQ(got.size(), want.size());
    for (std::size_t i = 0; i < want.size(); ++i) {
        // Every conversion to double is exact, so equality is to the bit.
        ASSERT_TRUE(std::isnan(want[i]) ? std::isnan(got[i]) : got[i] == want[i])
            << i << ": " << got[i] << " for " << want[i];
    }
}

/// Packs a file as gzip with Python's own zlib.
void gzip(const std::filesystem::path& from, const std::filesystem::path& to) {
    const auto result = testing::run_command(
        {"/usr/bin/python3", "-c",
         "import gzip,sys; open(sys.argv[2],'wb').write(gzip.compress(open(sys.argv[1],'rb').read()))", from,
         to});
    ASSERT_EQ(result.status, 0) << result.output;
}

// From outside: healpy 1.16 reads the real maps that python3-healpy ships, and a gzip'd NESTED map of nside
// 512 with float32 denormals that python3-reproject ships.
TEST(FitsMapReader, ReadsRealMapsToTheBitAsHealpyDoes) {
    const TemporaryFolder folder;
    const std::string healpy = "/usr/share/healpy/test/data/";
    struct Real {
        std::string path;
        int columns;
        std::int64_t undefined;
    };
    // File names as the package has them.
    const std::string stem = healpy + "wmap_band_iqumap_r9_7yr_W_v4_udgraded32";
    const Real maps[] = {
        {stem + ".fits", 3, 0},
        {stem + "_masked.fits", 3, 4686},
        {stem + "_smoothed10deg_fortran.fits", 3, 0},
        {healpy + "justq_gal2ecl.fits.gz", 2, 0},
        {"/usr/lib/python3/dist-packages/reproject/healpix/tests/data/bayestar.fits.gz", 1, 0}};
    std::vector<std::string> arguments = {folder / "values"};
    for (const auto& one : maps) {
        for (int c = 0; c < one.columns; ++c)
            arguments.insert(arguments.end(), {one.path, std::to_string(c)});
    }
    const auto oracle = run_oracle("fits_reading.py", arguments);
    ASSERT_EQ(oracle.status, 0) << oracle.output;
    const std::string bytes = read_whole_file(folder / "values");
    std::size_t offset = 0;
    for (const auto& one : maps) {
        SCOPED_TRACE(one.path);
        FitsMapRequest request = request_of(one.path);
        for (int c = 1; c <= one.columns; ++c)
            request.columns.emplace_back(c);
        const FitsMap map = read_fits_map(request);
        EXPECT_EQ(map.undefined, one.undefined);
        for (const auto& column : map.columns) {
            Values want(column.values.size());
            ASSERT_LE(offset + want.size() * sizeof(double), bytes.size());
            std::memcpy(want.data(), bytes.data() + offset, want.size() * sizeof(double));
            offset += want.size() * sizeof(double);
            expect_same(column.values, want);
        }
    }
    EXPECT_EQ(offset, bytes.size());
}

TEST(FitsMapReader, LeavesOpenWhatRealHeadersLeaveOpen) {
    const std::string stem = "/usr/share/healpy/test/data/wmap_band_iqumap_r9_7yr_W_v4_udgraded32";
    const FitsMap bare = read_fits_map(request_of(stem + ".fits", {"i_stokes", "U_STOKES"}));
    EXPECT_EQ(bare.grid.nside(), 32);
    EXPECT_FALSE(bare.frame);
    EXPECT_FALSE(bare.convention);
    EXPECT_EQ(bare.columns[0].unit, "");
    EXPECT_EQ(bare.columns[1].name, "U_STOKES");
    EXPECT_TRUE(bare.notices.empty());

    const FitsMap unknown =
        read_fits_map(request_of(stem + "_smoothed10deg_fortran.fits", {"Q-POLARISATION"}));
    EXPECT_FALSE(unknown.frame);             // COORDSYS = 'unknown'
    EXPECT_EQ(unknown.columns[0].unit, "");  // TUNIT2 = 'unknown'
    EXPECT_EQ(unknown.convention, PolarizationConvention::Cosmo);
    EXPECT_TRUE(unknown.notices.empty());

    const FitsMap nested = read_fits_map(
        request_of("/usr/lib/python3/dist-packages/reproject/healpix/tests/data/bayestar.fits.gz"));
    EXPECT_EQ(nested.grid.nside(), 512);
    EXPECT_EQ(nested.file_ordering, Ordering::Nested);
    EXPECT_EQ(nested.frame, Frame::Icrs);
    ASSERT_EQ(nested.notices.size(), 1U);
    EXPECT_NE(nested.notices[0].find("NESTED order is converted to RING"), std::string::npos);
    double smallest = 1;
    for (const double value : nested.columns[0].values) {
        if (value > 0) smallest = std::min(smallest, value);
    }
    EXPECT_LT(smallest, 1.17549e-38);  // below the smallest normal float32: denormals survive
}

TEST(FitsMapReader, ReadsEveryTypeOfNumberAndScalesIt) {
    const Values values = {0, 1, 2, 3, 100, 101, 102, 103, 200, 201, 202, 255};
    for (const std::string format : {"1B", "B", "12B", "4I", "1J", "K", "12K", "1E", "3E", "D", "6D"}) {
        SCOPED_TRACE(format);
        expect_same(read_built(FitsMapBuilder(1).column("A", format, values)).columns[0].values, values);
        Values scaled = values;
        for (double& value : scaled)
            value = 0.5 * value - 7;  // exact in binary
        expect_same(
            read_built(
                FitsMapBuilder(1).column("A", format, values).card("TSCAL1", "0.5").card("TZERO1", "-7"))
                .columns[0]
                .values,
            scaled);
    }
    const Values negative = {-1, -128, -32768, 5, 0, 0, 0, 0, 0, 0, 0, 32767};
    for (const std::string format : {"1I", "1J", "2K"}) {
        expect_same(read_built(FitsMapBuilder(1).column("A", format, negative)).columns[0].values, negative);
    }
    Values with_null = negative;
    with_null[1] = nan;
    const FitsMap map = read_built(FitsMapBuilder(1).column("A", "1I", negative).card("TNULL1", "-128"));
    expect_same(map.columns[0].values, with_null);
    EXPECT_EQ(map.undefined, 1);
}

TEST(FitsMapReader, FindsUndefinedPixelsByEverySign) {
    const double unseen = -1.6375e30;
    const Values values = {1,       unseen, nan,    inf,   -inf, unseen * (1 + 9e-6), unseen * (1 + 1.1e-5),
                           -unseen, -999,   5e-324, -9999, 12};
    Values want = values;
    for (const int i : {1, 2, 3, 4, 5})
        want[static_cast<std::size_t>(i)] = nan;
    const FitsMap map = read_built(FitsMapBuilder(1).column("A", "1D", values));
    expect_same(map.columns[0].values, want);
    EXPECT_EQ(map.undefined, 5);
    want[8] = nan;
    const FitsMap other = read_built(FitsMapBuilder(1).column("A", "1D", values).card("BAD_DATA", "-999."));
    expect_same(other.columns[0].values, want);
    EXPECT_EQ(other.undefined, 6);
    // A pixel counts once, in however many of the columns it is undefined.
    Values b = ramp(12);
    b[1] = b[11] = nan;
    EXPECT_EQ(read_built(FitsMapBuilder(1).column("A", "1D", values).column("B", "1E", b), {1, 2}).undefined,
              6);
    EXPECT_EQ(read_built(FitsMapBuilder(1).column("A", "1D", values).column("B", "1E", b), {2}).undefined, 2);
}

TEST(FitsMapReader, TakesOrderingInAnyCaseAndNest) {
    const TemporaryFolder folder;
    const HealpixGrid grid(2);
    for (const std::string text : {"NESTED", "nested", "Nest", "NEST", "RING", "ring"}) {
        const FitsMap map =
            read_built(FitsMapBuilder(2).column("A", "1E", ramp(48)).card("ORDERING", card_text(text)));
        const bool nested = text[0] == 'N' || text[0] == 'n';
        for (std::int64_t p = 0; p < 48; ++p) {
            EXPECT_EQ(map.columns[0].values[static_cast<std::size_t>(p)],
                      static_cast<double>(nested ? grid.ring_to_nested(p) : p));
        }
        const bool odd = text != "NESTED" && text != "RING";
        EXPECT_EQ(map.notices.size(), (odd ? 1U : 0U) + (nested ? 1U : 0U)) << text;
    }
    FitsMapBuilder(2).column("A", "1E", ramp(48)).without("ORDERING").write(folder / "m.fits");
    FitsMapRequest request = request_of(folder / "m.fits");
    request.ordering = Ordering::Nested;
    EXPECT_EQ(read_fits_map(request).file_ordering, Ordering::Nested);
    EXPECT_FALSE(read_fits_map_header(request_of(folder / "m.fits")).ordering);  // left open, no error
}

TEST(FitsMapReader, ReadsPartialMapsWhateverTheTypeOfTheirPixelNumbers) {
    const HealpixGrid grid(4);
    const Values pixels = {7, 191, 0, 33};
    const Values values = {1.5, -2, nan, 4};
    for (const std::string format : {"1I", "1J", "1K", "1E", "1D", "2J", "B"}) {
        for (const bool nested : {false, true}) {
            SCOPED_TRACE(format);
            const std::string cells = format[0] == '2' ? "2E" : "1E";
            const FitsMap map = read_built(FitsMapBuilder(4)
                                               .column("PIXEL", format, pixels)
                                               .column("SIGNAL", cells, values)
                                               .card("INDXSCHM", "'EXPLICIT'")
                                               .card("ORDERING", nested ? "'NESTED'" : "'RING'"));
            Values want(192, nan);
            for (std::size_t i = 0; i < pixels.size(); ++i) {
                const auto pixel = static_cast<std::int64_t>(pixels[i]);
                want[static_cast<std::size_t>(nested ? grid.nested_to_ring(pixel) : pixel)] = values[i];
            }
            expect_same(map.columns[0].values, want);
            EXPECT_TRUE(map.partial);
            EXPECT_EQ(map.undefined, 192 - 3);
            EXPECT_EQ(map.columns[0].name, "SIGNAL");
        }
    }
    // Without INDXSCHM the PIXEL column says it; without the name PIXEL, the first column is taken, with a
    // notice.
    EXPECT_TRUE(
        read_built(
            FitsMapBuilder(4).column("Pixel", "1J", pixels).column("S", "1E", values).without("INDXSCHM"))
            .partial);
    EXPECT_EQ(read_built(FitsMapBuilder(4)
                             .column("INDEX", "1J", pixels)
                             .column("S", "1E", values)
                             .card("INDXSCHM", "'explicit'"))
                  .notices.size(),
              1U);
}

TEST(FitsMapReader, ReadsGzippedFilesWhateverTheirName) {
    const TemporaryFolder folder;
    FitsMapBuilder(16)
        .column("A", "1024E", ramp(3072))
        .column("B", "1024J", ramp(3072, 9))
        .write(folder / "plain.fits");
    for (const std::string name : {"packed.fits.gz", "packed.fits"}) {
        gzip(folder / "plain.fits", folder / name);
        const FitsMap map = read_fits_map(request_of(folder / name, {2, "A"}));
        expect_same(map.columns[0].values, ramp(3072, 9));
        expect_same(map.columns[1].values, ramp(3072));
    }
}

TEST(FitsMapReader, ReadsLongRowsAndManyRowsTheSameForAnyNumberOfThreads) {
    const auto npix = static_cast<std::size_t>(12 * 128 * 128);
    const Values a = ramp(npix, -5), b = ramp(npix, 0, 0.5);
    for (const std::string format : {"1", "3", "1024", "49152", "196608"}) {  // the last is one row of 3 MB
        const auto builder = FitsMapBuilder(128).column("A", format + "E", a).column("B", format + "D", b);
        for (const int threads : {1, 3}) {
            set_thread_count(threads);
            const FitsMap map = read_built(builder, {"B", "A"});
            expect_same(map.columns[0].values, b);
            expect_same(map.columns[1].values, a);
            EXPECT_EQ(map.undefined, 0);
        }
        const FitsMap nested =
            read_built(FitsMapBuilder(128).column("A", format + "E", a).card("ORDERING", "'NESTED'"));
        EXPECT_EQ(nested.columns[0].values[0], -5 + static_cast<double>(HealpixGrid(128).ring_to_nested(0)));
    }
    set_thread_count(available_processors());
}

TEST(FitsMapReader, TakesTheFirstHealpixTableUnlessTold) {
    const TemporaryFolder folder;
    const std::string plain_table =
        FitsMapBuilder(1).column("LIST", "1J", ramp(5)).without("PIXTYPE").table();
    write_whole_file(folder / "many.fits",
                     FitsMapBuilder::image(30, 20) + plain_table +
                         FitsMapBuilder(1).column("FIRST", "1E", ramp(12)).table() +
                         FitsMapBuilder(1).column("SECOND", "1E", ramp(12, 50)).table());
    FitsMapRequest request = request_of(folder / "many.fits");
    EXPECT_EQ(read_fits_map(request).columns[0].name, "FIRST");
    EXPECT_EQ(read_fits_map_header(request).hdu, 2);
    request.hdu = 3;
    EXPECT_EQ(read_fits_map(request).columns[0].values[0], 50);
}

TEST(FitsMapReader, TellsWhatAHeaderSaysWithoutItsPixels) {
    const TemporaryFolder folder;
    FitsMapBuilder(8)
        .column("TEMPERATURE", "768E", ramp(768), "mK_CMB ")
        .column("HITS", "768J", ramp(768), "UNKNOWN")
        .card("COORDSYS", "'Equatorial'")
        .card("POLCCONV", "'IAU'")
        .card("FREQ", "2.3E+10")
        .card("BEAMFWHM", "1")
        .card("SURVEY", "'it''s a test'")
        .write(folder / "map [1].fits");
    const FitsMapHeader header = read_fits_map_header(request_of(folder / "map [1].fits"));
    EXPECT_EQ(header.grid.nside(), 8);
    EXPECT_EQ(header.hdu, 1);
    EXPECT_EQ(header.frame, Frame::Icrs);
    EXPECT_EQ(header.ordering, Ordering::Ring);
    EXPECT_EQ(header.convention, PolarizationConvention::Iau);
    EXPECT_EQ(header.listed, 768);
    ASSERT_EQ(header.columns.size(), 2U);
    EXPECT_EQ(header.columns[0].unit, "mK_CMB");
    EXPECT_EQ(header.columns[1].unit, "");
    EXPECT_EQ(header.columns[1].format, "768J");
    EXPECT_EQ(header.columns[1].number, 2);
    EXPECT_EQ(header.number("FREQ"), 2.3e10);
    EXPECT_EQ(header.number("BEAMFWHM"), 1.0);
    EXPECT_EQ(header.text("SURVEY"), "it's a test");
    EXPECT_FALSE(header.number("ABSENT"));
    EXPECT_EQ(header.requested, std::vector<int>{1});
}

TEST(FitsMapReader, KnowsFramesInAllTheirSpellings) {
    const std::pair<const char*, std::optional<Frame>> spellings[] = {
        {"G", Frame::Galactic},     {"galactic", Frame::Galactic}, {"C", Frame::Icrs},
        {"Celestial", Frame::Icrs}, {"EQUATORIAL", Frame::Icrs},   {"ICRS", Frame::Icrs},
        {"E", Frame::Ecliptic},     {"ecliptic", Frame::Ecliptic}, {"unknown", std::nullopt},
        {"", std::nullopt},         {"Martian", std::nullopt}};
    for (const auto& [text, frame] : spellings) {
        const FitsMap map =
            read_built(FitsMapBuilder(1).column("A", "1E", ramp(12)).card("COORDSYS", card_text(text)));
        EXPECT_EQ(map.frame, frame) << text;
        EXPECT_EQ(map.notices.size(), std::string(text) == "Martian" ? 1U : 0U);
    }
    const TemporaryFolder folder;
    FitsMapBuilder(1).column("A", "1E", ramp(12)).without("COORDSYS").write(folder / "a.fits");
    FitsMapRequest request = request_of(folder / "a.fits");
    request.frame = Frame::Ecliptic;
    EXPECT_EQ(read_fits_map(request).frame, Frame::Ecliptic);
}

TEST(FitsMapReader, InfersNsideWithANotice) {
    const FitsMap map = read_built(FitsMapBuilder(1).column("A", "16E", ramp(48)).without("NSIDE"));
    EXPECT_EQ(map.grid.nside(), 2);
    ASSERT_EQ(map.notices.size(), 1U);
    EXPECT_NE(map.notices[0].find("so nside is 2"), std::string::npos);
}

TEST(Coverage, WantsPixelsThatAreDefinedAndNotZero) {
    const TemporaryFolder folder;
    Values mask(12, 0.0);
    mask[3] = 1;
    mask[5] = nan;
    mask[11] = 0.25;
    FitsMapBuilder(1).column("MASK", "1E", mask).write(folder / "a.fits");
    const CoverageMap full = read_coverage(request_of(folder / "a.fits"));
    EXPECT_EQ(full.pixels, (std::vector<std::int64_t>{3, 11}));
    EXPECT_EQ(full.frame, Frame::Galactic);
    mask[5] = 0;
    FitsMapBuilder(1).column("MASK", "12L", mask).card("ORDERING", "'NESTED'").write(folder / "b.fits");
    const HealpixGrid grid(1);
    std::vector<std::int64_t> want = {grid.nested_to_ring(3), grid.nested_to_ring(11)};
    std::sort(want.begin(), want.end());
    EXPECT_EQ(read_coverage(request_of(folder / "b.fits")).pixels, want);
    FitsMapBuilder(4)
        .column("PIXEL", "1J", {9, 4, 100})
        .card("INDXSCHM", "'EXPLICIT'")
        .write(folder / "c.fits");
    EXPECT_EQ(read_coverage(request_of(folder / "c.fits")).pixels, (std::vector<std::int64_t>{4, 9, 100}));
    EXPECT_EQ(read_coverage(request_of(folder / "c.fits")).grid.nside(), 4);
}

}  // namespace
}  // namespace foreglow
