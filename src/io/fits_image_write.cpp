// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_image_write.h"

#include <fitsio.h>

#include <algorithm>
#include <cctype>
#include <cmath>
#include <cstdlib>
#include <string>

#include "base/error.h"
#include "base/text.h"
#include "io/atomic_file.h"

namespace foreglow {
namespace {

constexpr std::size_t card_chars = 80;

std::int64_t value_count(const FitsImageLayout& layout) {
    std::int64_t count = 1;
    for (const std::int64_t axis : layout.axes)
        count *= axis;
    return count;
}

/// A FITS file that CFITSIO builds in memory.
class MemoryImage {
  public:
    explicit MemoryImage(const FitsImageLayout& layout) {
        fits_create_memfile(&file_, &buffer_, &size_, 1 << 20, std::realloc, &status_);
        std::vector<LONGLONG> axes(layout.axes.begin(), layout.axes.end());
        fits_create_imgll(file_, layout.float64 ? DOUBLE_IMG : FLOAT_IMG, static_cast<int>(axes.size()),
                          axes.data(), &status_);
        for (const FitsCard& card : layout.cards)
            std::visit([&](const auto& value) { add(card.key, value, card.comment); }, card.value);
        check();
    }
    ~MemoryImage() {
        int ignored = 0;
        if (file_ != nullptr) fits_close_file(file_, &ignored);
        std::free(buffer_);
    }
    MemoryImage(const MemoryImage&) = delete;
    MemoryImage& operator=(const MemoryImage&) = delete;

    void write(std::span<const double> values) {
        // CFITSIO does not change what it is given, but does not say so.
        fits_write_img(file_, TDOUBLE, 1, static_cast<LONGLONG>(values.size()),
                       const_cast<double*>(values.data()), &status_);
        check();
    }

    /// Adds CHECKSUM and DATASUM without the date that CFITSIO's own call would put into their comments.
    void add_checksums() {
        add("CHECKSUM", std::string("0000000000000000"), "HDU checksum");
        add("DATASUM", std::string("0"), "data unit checksum");
        fits_flush_file(file_, &status_);
        unsigned long data = 0, whole = 0;
        fits_get_chksum(file_, &data, &whole, &status_);
        fits_modify_key_str(file_, "DATASUM", std::to_string(data).c_str(), "&", &status_);
        fits_flush_file(file_, &status_);
        fits_get_chksum(file_, &data, &whole, &status_);
        char text[17] = {};
        fits_encode_chksum(whole, 1, text);
        fits_modify_key_str(file_, "CHECKSUM", text, "&", &status_);
        check();
    }

    /// Closes the file and returns its bytes.
    [[nodiscard]] std::span<const std::byte> finish() {
        LONGLONG header = 0, data = 0, end = 0;
        fits_get_hduaddrll(file_, &header, &data, &end, &status_);
        fits_close_file(file_, &status_);
        file_ = nullptr;
        check();
        return {static_cast<const std::byte*>(buffer_), static_cast<std::size_t>(end)};
    }

  private:
    void add(const std::string& key, const std::string& value, const std::string& comment) {
        fits_write_key_longstr(file_, key.c_str(), printable(value).c_str(), printable(comment).c_str(),
                               &status_);
    }
    void add(const std::string& key, std::int64_t value, const std::string& comment) {
        fits_write_key_lng(file_, key.c_str(), value, printable(comment).c_str(), &status_);
    }
    void add(const std::string& key, bool value, const std::string& comment) {
        fits_write_key_log(file_, key.c_str(), value ? 1 : 0, printable(comment).c_str(), &status_);
    }
    // The shortest digits that read back to the same double, which CFITSIO's own formats are not.
    void add(const std::string& key, double value, const std::string& comment) {
        FOREGLOW_EXPECTS(std::isfinite(value) && key.size() <= 8);
        std::string digits = format_exact(value);
        std::transform(digits.begin(), digits.end(), digits.begin(),
                       [](unsigned char c) { return static_cast<char>(std::toupper(c)); });
        if (digits.find_first_of(".E") == std::string::npos) digits += '.';
        std::string card = key + std::string(8 - key.size(), ' ') + "= ";
        if (digits.size() < 20) card.append(20 - digits.size(), ' ');
        card += digits;
        if (!comment.empty()) card += " / " + printable(comment);
        card.resize(card_chars, ' ');
        fits_write_record(file_, card.c_str(), &status_);
    }
    static std::string printable(std::string text) {
        for (char& c : text)
            if (c < 0x20 || c > 0x7e) c = '?';
        return text;
    }
    void check() const {
        if (status_ == 0) return;
        char text[FLEN_STATUS] = {};
        fits_get_errstatus(status_, text);
        fits_clear_errmsg();
        throw FileError(std::string("cannot build a FITS image in memory: ") + text);
    }

    fitsfile* file_ = nullptr;
    void* buffer_ = nullptr;
    std::size_t size_ = 0;
    int status_ = 0;
};

}  // namespace

std::int64_t fits_image_file_bytes(const FitsImageLayout& layout) {
    constexpr std::int64_t header = std::int64_t{3} * 2880;
    return header + value_count(layout) * (layout.float64 ? 8 : 4);
}

void write_fits_image(const std::filesystem::path& path, const FitsImageLayout& layout,
                      std::span<const double> values) {
    FOREGLOW_EXPECTS(static_cast<std::int64_t>(values.size()) == value_count(layout));
    MemoryImage image(layout);
    image.write(values);
    image.add_checksums();
    const auto bytes = image.finish();
    AtomicFile file(path);
    file.write_at(0, bytes);
    file.commit();
}

}  // namespace foreglow
