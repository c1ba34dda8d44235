// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_table_file.h"

#include <fcntl.h>
#include <fitsio.h>
#include <sys/mman.h>
#include <sys/stat.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <cstdlib>
#include <limits>
#include <mutex>

#include "base/error.h"
#include "base/text.h"
#include "io/atomic_file.h"
#include "io/fits_file_kind.h"
#include "io/fits_header_check.h"

namespace foreglow {
namespace {

constexpr int most_hdus = 1000;
constexpr std::int64_t most_fields = 999;  // FITS 4.0, section 7.3.1

/// Returns CFITSIO's words for a status, after forgetting its own pile of messages.
std::string status_text(int status) {
    char text[FLEN_STATUS] = {};
    fits_get_errstatus(status, text);
    fits_clear_errmsg();
    return std::string(text) + " (CFITSIO status " + std::to_string(status) + ")";
}

std::vector<FitsCard> read_cards(fitsfile* file, int& status) {
    int count = 0;
    fits_get_hdrspace(file, &count, nullptr, &status);
    std::vector<FitsCard> cards;
    for (int i = 1; i <= count && status == 0; ++i) {
        char key[FLEN_KEYWORD] = {}, value[FLEN_VALUE] = {}, comment[FLEN_COMMENT] = {};
        int one = 0;
        fits_read_keyn(file, i, key, value, comment, &one);
        if (one != 0) {  // an odd card is of no use, but does not spoil the others
            fits_clear_errmsg();
            continue;
        }
        cards.push_back({key, parse_card_value(value), comment});
    }
    return cards;
}

bool is_healpix(const std::vector<FitsCard>& cards) {
    return to_lower(card_text(cards, "PIXTYPE").value_or("")) == "healpix";
}

/// Says in words what the current HDU is: "an image of 512 x 512 pixels".
std::string describe_hdu(fitsfile* file, int type, const std::vector<FitsCard>& cards) {
    if (type != IMAGE_HDU) {
        const std::string name = card_text(cards, "EXTNAME").value_or("");
        return std::string(type == ASCII_TBL ? "a text table" : "a binary table") +
               (name.empty() ? "" : " '" + name + "'") + " of " +
               std::to_string(card_whole(cards, "NAXIS2").value_or(0)) + " rows";
    }
    int status = 0, axes = 0;
    LONGLONG lengths[9] = {};
    fits_get_img_dim(file, &axes, &status);
    fits_get_img_sizell(file, 9, lengths, &status);
    if (status != 0 || axes == 0) return "empty";
    std::string text = "an image of ";
    for (int i = 0; i < std::min(axes, 9); ++i)
        text += (i > 0 ? " x " : "") + std::to_string(lengths[i]);
    return text + " pixels";
}

std::int64_t cell_width(char type) {
    switch (type) {
        case 'L':
        case 'A':
        case 'B':
            return 1;
        case 'I':
            return 2;
        case 'J':
        case 'E':
            return 4;
        case 'K':
        case 'D':
        case 'C':
        case 'P':
            return 8;
        case 'M':
        case 'Q':
            return 16;
        default:
            return 0;
    }
}

/// Reads TFORM: an optional repeat count, then the letter (FITS 4.0, section 7.3.1).
bool read_format(FitsTableColumn& column) {
    const std::string& text = column.format;
    char* end = nullptr;
    errno = 0;
    const bool counted = !text.empty() && text.front() >= '0' && text.front() <= '9';
    column.repeat = counted ? std::strtoll(text.c_str(), &end, 10) : 1;
    const std::size_t at = counted ? static_cast<std::size_t>(end - text.c_str()) : 0;
    if (errno != 0 || at >= text.size()) return false;
    column.type = text[at];
    column.width = cell_width(column.type);
    return column.width > 0 || column.type == 'X';
}

}  // namespace

std::string message_table(const FitsMapRequest& request, int hdu) {
    return request.path.string() + ", HDU " + std::to_string(hdu) + ": ";
}

struct FitsTableFile::Impl {
    explicit Impl(const FitsMapRequest& request_in);
    ~Impl() {
        int ignored = 0;
        if (file != nullptr) fits_close_file(file, &ignored);
        fits_clear_errmsg();
        if (mapped != nullptr) ::munmap(mapped, static_cast<std::size_t>(file_bytes));
        if (descriptor >= 0) ::close(descriptor);
    }
    Impl(const Impl&) = delete;
    Impl& operator=(const Impl&) = delete;

    void open_file();
    void find_table();
    [[noreturn]] void fail_without_table(const std::string& seen) const;
    void read_columns();
    void check_length();
    void read_with_library(std::int64_t offset, std::span<std::byte> out) const;

    FitsMapRequest request;
    FitsTable table;
    fitsfile* file = nullptr;
    int descriptor = -1;
    bool plain = true;  // else unpacked by CFITSIO in memory
    std::int64_t data_start = 0, file_bytes = 0;
    mutable std::mutex library;
    void* mapped = nullptr;  // the whole file, once asked for
};

FitsTableFile::Impl::Impl(const FitsMapRequest& request_in) : request(request_in) {
    try {
        open_file();
        find_table();
        check_length();
    } catch (...) {  // the destructor does not run for a half-made object
        int ignored = 0;
        if (file != nullptr) fits_close_file(file, &ignored);
        fits_clear_errmsg();
        if (descriptor >= 0) ::close(descriptor);
        throw;
    }
}

void FitsTableFile::Impl::open_file() {
    plain = check_fits_file_kind(message_place(request), request.path) == FitsFileKind::Plain;
    descriptor = ::open(request.path.c_str(), O_RDONLY | O_CLOEXEC);
    struct stat facts {};
    if (descriptor < 0 || ::fstat(descriptor, &facts) != 0) {
        throw FileError("cannot read " + request.path.string() + ": " + system_reason(errno));
    }
    file_bytes = facts.st_size;
    if (plain) check_fits_header(descriptor, 0, message_table(request, 0));
    int status = 0;
    if (fits_open_diskfile(&file, request.path.c_str(), READONLY, &status) != 0) {
        file = nullptr;
        throw DataError(request.path.string() + ": this FITS file cannot be opened: " + status_text(status) +
                        "; it is damaged, or cut short: get it again");
    }
}

void FitsTableFile::Impl::find_table() {
    std::string seen;
    for (int hdu = 0; hdu < most_hdus; ++hdu) {
        int status = 0, type = 0;
        LONGLONG next = 0;
        if (hdu > 0) fits_get_hduaddrll(file, nullptr, nullptr, &next, &status);
        if (plain && next > 0) check_fits_header(descriptor, next, message_table(request, hdu));
        fits_movabs_hdu(file, hdu + 1, &type, &status);
        if (status == END_OF_FILE && hdu > 0) break;
        const bool wanted = request.hdu.value_or(hdu) == hdu;
        if (status != 0 && wanted) {
            throw DataError(message_table(request, hdu) + "its header cannot be read: " +
                            status_text(status) + "; the file is damaged: get it again");
        }
        if (status != 0) break;
        const std::vector<FitsCard> cards = read_cards(file, status);
        if (wanted && (is_healpix(cards) || request.hdu) && type == BINARY_TBL) {
            table.hdu = hdu;
            table.cards = cards;
            return read_columns();
        }
        seen +=
            (hdu > 0 ? "; HDU " : "HDU ") + std::to_string(hdu) + " is " + describe_hdu(file, type, cards);
        if (request.hdu == hdu) {
            throw InputError(message_place(request) + "`hdu = " + std::to_string(hdu) +
                             "` names no HEALPix table: in " + request.path.string() + " " + seen +
                             "; name the HDU of a binary table (1 is the first extension)");
        }
    }
    fits_clear_errmsg();
    fail_without_table(seen);
}

/// Says what the file holds in place of a map, and what to do about it.
void FitsTableFile::Impl::fail_without_table(const std::string& seen) const {
    if (request.hdu) {
        throw InputError(message_place(request) + "there is no HDU " + std::to_string(*request.hdu) + " in " +
                         request.path.string() + ": " + seen +
                         "; 0 is the primary HDU, 1 the first extension");
    }
    const std::string none =
        request.path.string() +
        ": no HEALPix map in this file (a binary table with PIXTYPE = 'HEALPIX'): " + seen;
    if (seen == "HDU 0 is empty") {
        throw DataError(none +
                        " and nothing readable follows; the file is damaged or cut short: get it again");
    }
    if (seen.find("a binary table") == std::string::npos) throw DataError(none + "; name another file");
    throw DataError(none + "; if a table is a map all the same, name its HDU with `hdu`");
}

void FitsTableFile::Impl::read_columns() {
    const std::string where = message_table(request, table.hdu);
    table.rows = card_whole(table.cards, "NAXIS2").value_or(-1);
    table.row_bytes = card_whole(table.cards, "NAXIS1").value_or(-1);
    const std::int64_t fields =
        std::min<std::int64_t>(card_whole(table.cards, "TFIELDS").value_or(0), most_fields);
    std::int64_t offset = 0;
    for (int number = 1; number <= fields; ++number) {
        const std::string n = std::to_string(number);
        FitsTableColumn column;
        column.number = number;
        column.name = card_text(table.cards, "TTYPE" + n).value_or("");
        column.unit = card_text(table.cards, "TUNIT" + n).value_or("");
        if (to_lower(column.unit) == "unknown") column.unit.clear();
        column.format = card_text(table.cards, "TFORM" + n).value_or("");
        column.scale = card_number(table.cards, "TSCAL" + n).value_or(1.0);
        column.zero = card_number(table.cards, "TZERO" + n).value_or(0.0);
        column.null_value = card_whole(table.cards, "TNULL" + n);
        if (!read_format(column)) {
            throw DataError(where + "TFORM" + n + " = '" + column.format +
                            "' is no column format; the header is damaged");
        }
        column.offset = offset;
        const bool bits = column.type == 'X';
        std::int64_t bytes = 0;
        if (__builtin_mul_overflow(column.repeat, bits ? 1 : column.width, &bytes) ||
            __builtin_add_overflow(offset, bits ? (bytes + 7) / 8 : bytes, &offset)) {
            throw DataError(where + "TFORM" + n + " = '" + column.format +
                            "' is absurdly long; the header is damaged");
        }
        table.columns.push_back(column);
    }
    if (offset != table.row_bytes || table.columns.empty()) {
        throw DataError(where + "the columns make rows of " + std::to_string(offset) +
                        " bytes, but NAXIS1 = " + std::to_string(table.row_bytes) +
                        "; the header is damaged");
    }
}

/// Refuses a table that is longer than its file, before memory of that size is taken.
void FitsTableFile::Impl::check_length() {
    const std::string where = message_table(request, table.hdu);
    std::int64_t bytes = 0, end = 0;
    int status = 0;
    LONGLONG start = 0;
    fits_get_hduaddrll(file, nullptr, &start, nullptr, &status);
    data_start = start;
    if (status != 0 || table.rows < 0 || __builtin_mul_overflow(table.rows, table.row_bytes, &bytes) ||
        __builtin_add_overflow(bytes, data_start, &end)) {
        throw DataError(where + "NAXIS2 = " + std::to_string(table.rows) + " rows of " +
                        std::to_string(table.row_bytes) + " bytes cannot be; the header is damaged");
    }
    if (table.rows == 0) throw DataError(where + "the table has no rows (NAXIS2 = 0): there is no map in it");
    const std::string cut = "; the file is cut short: get it again";
    if (plain && end > file_bytes) {
        throw DataError(where + "the header promises " + std::to_string(table.rows) + " rows up to byte " +
                        std::to_string(end) + ", but the file ends at byte " + std::to_string(file_bytes) +
                        cut);
    }
    if (!plain) {
        std::byte last{};
        fits_read_tblbytes(file, table.rows, table.row_bytes, 1, reinterpret_cast<unsigned char*>(&last),
                           &status);
        if (status != 0) {
            fits_clear_errmsg();
            throw DataError(where + "the header promises " + std::to_string(table.rows) + " rows of " +
                            std::to_string(table.row_bytes) + " bytes, but the unpacked file ends before" +
                            cut);
        }
    }
}

void FitsTableFile::Impl::read_with_library(std::int64_t offset, std::span<std::byte> out) const {
    const std::lock_guard lock(library);
    int status = 0;
    const std::int64_t row = offset / table.row_bytes;
    fits_read_tblbytes(file, row + 1, offset % table.row_bytes + 1, static_cast<LONGLONG>(out.size()),
                       reinterpret_cast<unsigned char*>(out.data()), &status);
    if (status != 0) {
        throw DataError(message_table(request, table.hdu) + "row " + std::to_string(row + 1) +
                        " cannot be read: " + status_text(status) + "; the file is damaged: get it again");
    }
}

FitsTableFile::FitsTableFile(const FitsMapRequest& request) : impl_(std::make_unique<Impl>(request)) {}
FitsTableFile::~FitsTableFile() = default;

const FitsTable& FitsTableFile::table() const {
    return impl_->table;
}

void FitsTableFile::read_bytes(std::int64_t offset, std::span<std::byte> out) const {
    FOREGLOW_EXPECTS(offset >= 0 &&
                     offset + static_cast<std::int64_t>(out.size()) <= table().rows * table().row_bytes);
    if (!impl_->plain) return impl_->read_with_library(offset, out);
    std::int64_t at = impl_->data_start + offset;
    while (!out.empty()) {
        const ssize_t got = ::pread(impl_->descriptor, out.data(), out.size(), at);
        if (got < 0 && errno == EINTR) continue;
        if (got < 0)
            throw FileError("cannot read " + impl_->request.path.string() + ": " + system_reason(errno));
        if (got == 0)
            throw FileError("cannot read " + impl_->request.path.string() +
                            ": it became shorter while being read");
        at += got;
        out = out.subspan(static_cast<std::size_t>(got));
    }
}

std::span<const std::byte> FitsTableFile::view() const {
    if (!impl_->plain) return {};
    const std::lock_guard lock(impl_->library);
    if (impl_->mapped == nullptr) {
        void* const address = ::mmap(nullptr, static_cast<std::size_t>(impl_->file_bytes), PROT_READ,
                                     MAP_SHARED, impl_->descriptor, 0);
        if (address == MAP_FAILED)
            throw FileError("cannot map " + impl_->request.path.string() +
                            " into memory: " + system_reason(errno));
        impl_->mapped = address;
    }
    return {static_cast<const std::byte*>(impl_->mapped) + impl_->data_start,
            static_cast<std::size_t>(table().rows * table().row_bytes)};
}

}  // namespace foreglow
