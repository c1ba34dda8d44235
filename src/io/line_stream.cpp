// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/line_stream.h"

#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cerrno>

#include "base/error.h"
#include "base/interrupt.h"
#include "io/atomic_file.h"

namespace foreglow {
namespace {

constexpr std::size_t piece_bytes = std::size_t{1} << 20;

}  // namespace

LineStream::LineStream(const std::filesystem::path& path, const std::string& what) : name_(path.string()) {
    if (name_ == "-") {
        name_ = "standard input";
        descriptor_ = STDIN_FILENO;
        return;
    }
    std::error_code code;
    if (!std::filesystem::exists(path, code)) throw InputError("there is no " + what + " " + name_);
    if (std::filesystem::is_directory(path, code)) throw InputError(name_ + " is a folder: name a " + what);
    descriptor_ = ::open(path.c_str(), O_RDONLY | O_CLOEXEC);
    if (descriptor_ < 0) throw FileError("cannot read " + name_ + ": " + system_reason(errno));
    owned_ = true;
}

LineStream::~LineStream() {
    if (owned_) ::close(descriptor_);
}

bool LineStream::next() {
    first_line_ += static_cast<std::int64_t>(lines_.size());
    lines_.clear();
    buffer_.erase(0, used_);
    used_ = 0;
    while (!at_end_) {
        if (buffer_.size() >= piece_bytes)
            throw DataError(place(0) + ": this line is longer than 1 MiB: it is no table of positions");
        const std::size_t kept = buffer_.size();
        buffer_.resize(piece_bytes);
        const ssize_t got = ::read(descriptor_, buffer_.data() + kept, piece_bytes - kept);
        const int reason = errno;
        buffer_.resize(kept + static_cast<std::size_t>(got > 0 ? got : 0));
        if (got < 0 && reason == EINTR) {
            check_interrupt();
            continue;
        }
        if (got < 0) throw FileError("cannot read " + name_ + ": " + system_reason(reason));
        at_end_ = got == 0;
        cut_lines();
        if (!lines_.empty()) return true;
    }
    return false;
}

void LineStream::cut_lines() {
    if (at_end_ && !buffer_.empty() && buffer_.back() != '\n') buffer_ += '\n';
    const std::string_view text(buffer_);
    for (auto end = text.find('\n', used_); end != std::string_view::npos; end = text.find('\n', used_)) {
        lines_.push_back(text.substr(used_, end - used_));
        used_ = end + 1;
    }
}

std::string LineStream::place(std::size_t line) const {
    return name_ + ":" + std::to_string(first_line_ + static_cast<std::int64_t>(line));
}

}  // namespace foreglow
