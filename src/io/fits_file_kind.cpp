// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_file_kind.h"

#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <array>
#include <cerrno>
#include <string_view>

#include "base/error.h"
#include "base/text.h"
#include "io/atomic_file.h"

namespace foreglow {
namespace {

/// Says what a file that is no FITS file looks like, or "".
std::string guess_kind(std::string_view start) {
    struct Kind {
        std::string_view signature;
        const char* name;
    };
    using namespace std::literals;
    static constexpr std::array kinds = {Kind{"\x89PNG"sv, "a PNG picture"},
                                         Kind{"\xff\xd8\xff"sv, "a JPEG picture"},
                                         Kind{"%PDF"sv, "a PDF document"},
                                         Kind{"\x89HDF"sv, "an HDF5 file"},
                                         Kind{"PK\x03\x04"sv, "a ZIP archive"},
                                         Kind{"BZh"sv, "a bzip2 file: unpack it first"},
                                         Kind{"\x1f\x9d"sv, "a file packed by compress: unpack it first"},
                                         Kind{"\xfd"
                                              "7zXZ"sv,
                                              "an xz file: unpack it first"},
                                         Kind{"\x28\xb5\x2f\xfd"sv, "a zstd file: unpack it first"},
                                         Kind{"\x93NUMPY"sv, "a NumPy array"},
                                         Kind{"CDF"sv, "a netCDF file"},
                                         Kind{"GIF8"sv, "a GIF picture"}};
    for (const auto& kind : kinds) {
        if (start.substr(0, kind.signature.size()) == kind.signature) return kind.name;
    }
    const std::string lower = to_lower(trim(start));
    if (lower.rfind("<!doctype html", 0) == 0 || lower.rfind("<html", 0) == 0)
        return "a web page, perhaps saved instead of the file";
    return "";
}

}  // namespace

FitsFileKind check_fits_file_kind(const std::string& place, const std::filesystem::path& path) {
    struct stat facts {};
    if (::stat(path.c_str(), &facts) != 0) {
        const int reason = errno;
        if (reason == ENOENT || reason == ENOTDIR)
            throw InputError(place + "there is no file " + path.string() + "; check the path");
        throw FileError("cannot read " + path.string() + ": " + system_reason(reason));
    }
    if (S_ISDIR(facts.st_mode))
        throw InputError(place + path.string() + " is a folder, not a FITS file; name the file in it");
    if (!S_ISREG(facts.st_mode))
        throw InputError(place + path.string() + " is not a regular file; copy the map to one first");
    const int descriptor = ::open(path.c_str(), O_RDONLY | O_CLOEXEC);
    if (descriptor < 0) throw FileError("cannot read " + path.string() + ": " + system_reason(errno));
    std::array<char, 64> bytes{};
    const ssize_t got = ::pread(descriptor, bytes.data(), bytes.size(), 0);
    const int reason = errno;
    ::close(descriptor);
    if (got < 0) throw FileError("cannot read " + path.string() + ": " + system_reason(reason));
    if (got == 0) throw DataError(path.string() + ": the file is empty; get it again");
    const std::string_view start(bytes.data(), static_cast<std::size_t>(got));
    if (start.substr(0, 9) == "SIMPLE  =") return FitsFileKind::Plain;
    if (start.substr(0, 2) == "\x1f\x8b") return FitsFileKind::Gzip;
    const std::string kind = guess_kind(start);
    throw DataError(path.string() + ": not a FITS file (one begins with SIMPLE)" +
                    (kind.empty() ? "" : "; it looks like " + kind));
}

}  // namespace foreglow
