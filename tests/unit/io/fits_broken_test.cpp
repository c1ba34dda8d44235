// SPDX-License-Identifier: GPL-2.0-or-later
// Broken files and wrong requests: each gives one clear sentence, the right exit status, and leaves nothing
// behind.
#include <gtest/gtest.h>

#include <functional>

#include "base/error.h"
#include "io/fits_map_read.h"
#include "support/fits_builder.h"
#include "support/run_command.h"

namespace foreglow {
namespace {

using testing::FitsMapBuilder;
using testing::TemporaryFolder;
using testing::write_whole_file;

constexpr int broken = 1, wrong = 2;  // exit statuses of the interface page

std::vector<double> ones(std::size_t count) {
    return std::vector<double>(count, 1.0);
}

FitsMapBuilder sound(int nside = 4) {
    return FitsMapBuilder(nside).column("I_STOKES", "1E", ones(static_cast<std::size_t>(12 * nside * nside)),
                                        "K_RJ");
}

FitsMapBuilder sound_partial(std::vector<double> pixels) {
    const std::size_t count = pixels.size();
    return FitsMapBuilder(4)
        .column("PIXEL", "1J", std::move(pixels))
        .column("SIGNAL", "1E", ones(count))
        .card("INDXSCHM", "'EXPLICIT'");
}

struct Broken {
    std::string what;
    std::string bytes;
    int status;
    std::string sentence;  ///< after the path
    std::function<void(FitsMapRequest&)> ask = {};
};

/// Reads the file and returns the error's message, which must be one line of the wanted status.
std::string message_of(const FitsMapRequest& request, int status) {
    try {
        static_cast<void>(read_fits_map(request));
    } catch (const Error& error) {
        EXPECT_EQ(error.exit_status(), status) << error.what();
        return error.what();
    }
    return "no error";
}

void expect_sentences(const std::vector<Broken>& all) {
    for (const auto& one : all) {
        SCOPED_TRACE(one.what);
        const TemporaryFolder folder;
        write_whole_file(folder / "m.fits", one.bytes);
        FitsMapRequest request;
        request.path = folder / "m.fits";
        if (one.ask) one.ask(request);
        std::string message = message_of(request, one.status);
        EXPECT_EQ(message.find('\n'), std::string::npos);
        for (std::size_t at; (at = message.find(request.path.string())) != std::string::npos;) {
            message.replace(at, request.path.string().size(), "m.fits");
        }
        EXPECT_EQ(message, one.sentence);
        EXPECT_EQ(folder.names(), std::set<std::string>{"m.fits"});
    }
}

TEST(BrokenFits, FilesThatAreNoFitsFiles) {
    expect_sentences({
        {"empty", "", broken, "m.fits: the file is empty; get it again"},
        {"text", "nside 4\n1 2 3\n", broken, "m.fits: not a FITS file (one begins with SIMPLE)"},
        {"web page", "\n<!DOCTYPE html><html>404</html>", broken,
         "m.fits: not a FITS file (one begins with SIMPLE); it looks like a web page, perhaps saved instead "
         "of the file"},
        {"picture", "\x89PNG\r\n\x1a\n0000", broken,
         "m.fits: not a FITS file (one begins with SIMPLE); it looks like a PNG picture"},
        {"only a beginning", sound().bytes().substr(0, 1000), broken,
         "m.fits, HDU 0: the header has no END card; the file is damaged or cut short: get it again"},
        {"broken gzip", std::string("\x1f\x8b\x08\0\0\0\0\0\0\3garbage that is no deflate stream", 44),
         broken,
         "m.fits: this FITS file cannot be opened: error uncompressing image (CFITSIO status 414); it is "
         "damaged, or cut short: get it again"},
        {"no end of header",
         std::string(sound().bytes()).replace(2880 + 80, 2880 - 80, std::string(2880 - 80, ' ')), broken,
         "m.fits, HDU 1: the header has no END card; the file is damaged or cut short: get it again"},
    });
}

TEST(BrokenFits, FilesWithoutAMap) {
    const std::string plain_table =
        FitsMapBuilder(1).column("LIST", "1J", ones(5)).without("PIXTYPE").card("EXTNAME", "'OTHER'").table();
    expect_sentences({
        {"an image", FitsMapBuilder::image(30, 20), broken,
         "m.fits: no HEALPix map in this file (a binary table with PIXTYPE = 'HEALPIX'): HDU 0 is an image "
         "of 30 x 20 pixels; name another file"},
        {"another table", FitsMapBuilder::image(30, 20) + plain_table, broken,
         "m.fits: no HEALPix map in this file (a binary table with PIXTYPE = 'HEALPIX'): HDU 0 is an image "
         "of 30 x 20 pixels; HDU 1 is a binary table 'OTHER' of 5 rows; if a table is a map all the same, "
         "name its HDU with `hdu`"},
        {"an image by number", FitsMapBuilder::image(30, 20) + sound().table(), wrong,
         "model.toml:3:7: `hdu = 0` names no HEALPix table: in m.fits HDU 0 is an image of 30 x 20 pixels; "
         "name the HDU of a binary table (1 is the first extension)",
         [](FitsMapRequest& request) {
             request.hdu = 0;
             request.place = "model.toml:3:7";
         }},
        {"an HDU that is not there", sound().bytes(), wrong,
         "there is no HDU 4 in m.fits: HDU 0 is empty; HDU 1 is a binary table of 192 rows; 0 is the primary "
         "HDU, 1 the first extension",
         [](FitsMapRequest& request) { request.hdu = 4; }},
        {"no rows", FitsMapBuilder(4).column("A", "1E", {}).card("NAXIS1", "4").bytes(), broken,
         "m.fits, HDU 1: the table has no rows (NAXIS2 = 0): there is no map in it"},
        {"only pixel numbers",
         FitsMapBuilder(4).column("PIXEL", "1J", {1, 2}).card("INDXSCHM", "'EXPLICIT'").bytes(), broken,
         "m.fits, HDU 1: there is no column but the pixel numbers: no map is in it"},
        {"a column of text", FitsMapBuilder(1).column("A", "1A", ones(12)).bytes(), broken,
         "m.fits, HDU 1: none of the columns holds numbers: no map is in it"},
    });
}

TEST(BrokenFits, HeadersThatContradictThemselves) {
    const std::string bytes = sound().bytes();
    expect_sentences({
        {"cut short", bytes.substr(0, bytes.size() - 2880), broken,
         "m.fits, HDU 1: the header promises 192 rows up to byte 6528, but the file ends at byte 5760; the "
         "file is cut short: get it again"},
        {"huge NAXIS2", sound().card("NAXIS2", "123456789012345").bytes(), broken,
         "m.fits, HDU 1: the header promises 123456789012345 rows up to byte 493827156055140, but the file "
         "ends at byte 8640; the file is cut short: get it again"},
        {"NAXIS2 over all bounds", sound().card("NAXIS2", "9223372036854775807").bytes(), broken,
         "m.fits, HDU 1: NAXIS2 = 9223372036854775807 rows of 4 bytes cannot be; the header is damaged"},
        {"NAXIS1 wrong", sound().card("NAXIS1", "8").bytes(), broken,
         "m.fits, HDU 1: its header cannot be read: row width not = field widths (CFITSIO status 241); the "
         "file is damaged: get it again"},
        {"negative NAXIS2", sound().card("NAXIS2", "-192").bytes(), broken,
         "m.fits, HDU 1: NAXIS2 = -192 is no whole number of 0 or more; the header is damaged"},
        {"huge NSIDE", sound().card("NSIDE", "16384").bytes(), broken,
         "m.fits, HDU 1: NSIDE = 16384 is more than Foreglow handles (8192; one column in memory would take "
         "24.0 GiB); bring the map to a coarser grid first"},
        {"NSIDE of no grid", sound().card("NSIDE", "5").bytes(), broken,
         "m.fits, HDU 1: NSIDE = 5 is not a power of two; the header is damaged"},
        {"NSIDE zero", sound().card("NSIDE", "0").bytes(), broken,
         "m.fits, HDU 1: the card NSIDE holds no whole number of 1 or more; the header is damaged"},
        {"NSIDE a text", sound().card("NSIDE", "'four'").bytes(), broken,
         "m.fits, HDU 1: the card NSIDE holds no whole number of 1 or more; the header is damaged"},
        {"NSIDE against the rows", sound().card("NSIDE", "8").bytes(), broken,
         "m.fits, HDU 1: NAXIS2 = 192 rows of TFORM1 = '1E' make 192 pixels, but NSIDE = 8 wants 768; the "
         "header contradicts itself, or a partial map lacks INDXSCHM = 'EXPLICIT'"},
        {"last row partly used", FitsMapBuilder(4).column("A", "1024E", ones(1024)).bytes(), broken,
         "m.fits, HDU 1: NAXIS2 = 1 rows of TFORM1 = '1024E' make 1024 pixels, but NSIDE = 4 wants 192; the "
         "header contradicts itself, or a partial map lacks INDXSCHM = 'EXPLICIT'"},
        {"no NSIDE and no grid", FitsMapBuilder(4).column("A", "1E", ones(100)).without("NSIDE").bytes(),
         broken,
         "m.fits, HDU 1: there is no NSIDE card, and NAXIS2 = 100 rows of TFORM1 = '1E' make 100 pixels, "
         "which no nside has (12 nside^2)"},
        {"columns of different length", sound().column("B", "2E", ones(384)).bytes(), broken,
         "m.fits, HDU 1: column 2 'B' has TFORM = '2E', so 192 rows hold 384 values for 192 pixels",
         [](FitsMapRequest& request) { request.columns = {2}; }},
        {"too many columns", sound().card("TFIELDS", "1000").bytes(), broken,
         "m.fits, HDU 1: TFIELDS = 1000 is no whole number from 0 to 999; the header is damaged"},
        {"NAXIS2 a text", sound().card("NAXIS2", "'many'").bytes(), broken,
         "m.fits, HDU 1: NAXIS2 = 'many' is no whole number of 0 or more; the header is damaged"},
        {"TFORM of nothing", sound().card("TFORM1", "'4Z'").bytes(), broken,
         "m.fits, HDU 1: its header cannot be read: unknown TFORM datatype code (CFITSIO status 262); the "
         "file is damaged: get it again"},
        {"a column of text",
         FitsMapBuilder(1).column("A", "1E", ones(12)).column("NOTE", "1A", ones(12)).bytes(), broken,
         "m.fits, HDU 1: column 2 'NOTE' has TFORM = '1A', which holds no float, double or integer numbers",
         [](FitsMapRequest& request) { request.columns = {"note"}; }},
    });
}

TEST(BrokenFits, PartialMapsWithBrokenPixelNumbers) {
    expect_sentences({
        {"twice", sound_partial({3, 17, 191, 17}).bytes(), broken,
         "m.fits, HDU 1: row 4, column 'PIXEL': pixel 17 comes a second time; the file is damaged"},
        {"too large", sound_partial({3, 192}).bytes(), broken,
         "m.fits, HDU 1: row 2, column 'PIXEL': there is no pixel 192 at NSIDE = 4 (0 to 191); the file is "
         "damaged"},
        {"negative", sound_partial({-1, 4}).bytes(), broken,
         "m.fits, HDU 1: row 1, column 'PIXEL': there is no pixel -1 at NSIDE = 4 (0 to 191); the file is "
         "damaged"},
        {"not whole",
         FitsMapBuilder(4)
             .column("PIXEL", "1E", {1, 2.5})
             .column("S", "1E", ones(2))
             .card("INDXSCHM", "'EXPLICIT'")
             .bytes(),
         broken,
         "m.fits, HDU 1: row 2, column 'PIXEL': the pixel number is no whole number; the file is damaged"},
        {"not a number",
         FitsMapBuilder(4)
             .column("PIXEL", "1D", {0.0 / 0.0, 2})
             .column("S", "1E", ones(2))
             .card("INDXSCHM", "'EXPLICIT'")
             .bytes(),
         broken,
         "m.fits, HDU 1: row 1, column 'PIXEL': the pixel number is no whole number; the file is damaged"},
        {"more than there are", sound_partial(ones(193)).bytes(), broken,
         "m.fits, HDU 1: NAXIS2 = 193 rows of '1J' list more pixels than NSIDE = 4 has, 192"},
        {"without NSIDE", sound_partial({3, 4}).without("NSIDE").bytes(), broken,
         "m.fits, HDU 1: a partial map (explicit pixel numbers) without the card NSIDE cannot be placed on "
         "the sky"},
        {"pixel numbers as text",
         FitsMapBuilder(4)
             .column("PIXEL", "1A", {1})
             .column("S", "1E", ones(1))
             .card("INDXSCHM", "'EXPLICIT'")
             .bytes(),
         broken,
         "m.fits, HDU 1: the column of pixel numbers, 'PIXEL', has TFORM = '1A', which holds no numbers"},
        {"the pixel column asked for", sound_partial({3, 4}).bytes(), wrong,
         "column 1 'PIXEL' of m.fits holds the pixel numbers; name one of the others: 1 PIXEL, 2 SIGNAL",
         [](FitsMapRequest& request) { request.columns = {1}; }},
    });
}

TEST(BrokenFits, QuestionsAndContradictionsNameTheKey) {
    const auto ask = [](FitsMapRequest& request) {
        request.place = "model.toml:4:7";
        request.section = "intensity";
    };
    const std::string three =
        sound().column("Q_STOKES", "1E", ones(192)).column("U_STOKES", "1E", ones(192)).bytes();
    expect_sentences({
        {"no ordering", sound().without("ORDERING").bytes(), wrong,
         "model.toml:4:7: m.fits does not say in which order its pixels are (no card ORDERING); add "
         "`ordering = \"ring\"` to [intensity] or `ordering = \"nested\"`",
         ask},
        {"odd ordering", sound().card("ORDERING", "'spiral'").bytes(), wrong,
         "m.fits does not say in which order its pixels are (ORDERING = 'spiral'); add `ordering = \"ring\"` "
         "or `ordering = \"nested\"`"},
        {"other ordering", sound().bytes(), wrong,
         "model.toml:4:7: `ordering = \"nested\"` contradicts ORDERING = 'RING' in m.fits; remove the key, "
         "or correct the file",
         [&](FitsMapRequest& request) {
             ask(request);
             request.ordering = Ordering::Nested;
         }},
        {"other frame", sound().bytes(), wrong,
         "model.toml:4:7: `frame = \"ecliptic\"` contradicts COORDSYS = 'G' in m.fits; remove the key, or "
         "correct the file",
         [&](FitsMapRequest& request) {
             ask(request);
             request.frame = Frame::Ecliptic;
         }},
        {"no such column", three, wrong,
         "there is no column 4; in m.fits, HDU 1: the columns are 1 I_STOKES, 2 Q_STOKES, 3 U_STOKES",
         [](FitsMapRequest& request) { request.columns = {4}; }},
        {"column zero", three, wrong,
         "there is no column 0; in m.fits, HDU 1: the columns are 1 I_STOKES, 2 Q_STOKES, 3 U_STOKES",
         [](FitsMapRequest& request) { request.columns = {0}; }},
        {"a slip of the pen", three, wrong,
         "there is no column 'Q_STOKE' (did you mean 'Q_STOKES'?); in m.fits, HDU 1: the columns are 1 "
         "I_STOKES, 2 Q_STOKES, 3 U_STOKES",
         [](FitsMapRequest& request) { request.columns = {"Q_STOKE"}; }},
        {"a name twice", sound().column("i_stokes", "1E", ones(192)).bytes(), wrong,
         "two columns are called 'I_STOKES'; name it by number: in m.fits, HDU 1: the columns are 1 "
         "I_STOKES, 2 i_stokes",
         [](FitsMapRequest& request) { request.columns = {"I_STOKES"}; }},
    });
}

TEST(BrokenFits, PathsThatLeadToNoFile) {
    const TemporaryFolder folder;
    FitsMapRequest request;
    request.path = folder / "absent.fits";
    request.place = "model.toml:4:7";
    EXPECT_EQ(message_of(request, wrong),
              "model.toml:4:7: there is no file " + request.path.string() + "; check the path");
    request.path = folder.path();
    EXPECT_EQ(message_of(request, wrong), "model.toml:4:7: " + request.path.string() +
                                              " is a folder, not a FITS file; name the file in it");
    request.path = "/dev/null";
    EXPECT_EQ(message_of(request, wrong),
              "model.toml:4:7: /dev/null is not a regular file; copy the map to one first");
    // The library would try the name with .gz added; a file that is not there is not there.
    sound().write(folder / "other.fits.gz");
    request.path = folder / "other.fits";
    EXPECT_EQ(message_of(request, wrong),
              "model.toml:4:7: there is no file " + request.path.string() + "; check the path");
}

TEST(BrokenFits, GzippedFilesThatAreCutShort) {
    const TemporaryFolder folder;
    // Unpacked, the table ends early; and then the packed stream itself does.
    const std::string bytes = FitsMapBuilder(64).column("A", "1024E", ones(49152)).bytes();
    write_whole_file(folder / "cut", bytes.substr(0, 100000));
    write_whole_file(folder / "whole", bytes);
    for (const std::string name : {"cut", "whole"}) {
        const auto result = testing::run_command(
            {"/usr/bin/python3", "-c",
             "import gzip,sys; open(sys.argv[2],'wb').write(gzip.compress(open(sys.argv[1],'rb').read()))",
             folder / name, folder / (name + ".gz")});
        ASSERT_EQ(result.status, 0) << result.output;
    }
    FitsMapRequest request;
    request.path = folder / "cut.gz";
    EXPECT_EQ(message_of(request, broken),
              request.path.string() +
                  ", HDU 1: the header promises 48 rows of 4096 bytes, but the unpacked file ends before; "
                  "the file is cut short: get it again");
    const std::string packed = testing::read_whole_file(folder / "whole.gz");
    request.path = folder / "half.gz";
    write_whole_file(request.path, packed.substr(0, packed.size() / 2));
    EXPECT_EQ(message_of(request, broken),
              request.path.string() +
                  ": no HEALPix map in this file (a binary table with PIXTYPE = 'HEALPIX'): HDU 0 is empty "
                  "and nothing readable follows; the file is damaged or cut short: get it again");
}

// A header may promise what it likes: the check comes before the memory. 8192 columns' worth would be 6.4 GB.
TEST(BrokenFits, TakesNoMemoryForWhatIsNotThere) {
    const TemporaryFolder folder;
    FitsMapBuilder(8192).column("A", "1024E", ones(1024)).card("NAXIS2", "786432").write(folder / "m.fits");
    FitsMapRequest request;
    request.path = folder / "m.fits";
    EXPECT_EQ(message_of(request, broken),
              request.path.string() +
                  ", HDU 1: the header promises 786432 rows up to byte 3221231232, but the file ends at byte "
                  "11520; the file is cut short: get it again");
}

}  // namespace
}  // namespace foreglow
