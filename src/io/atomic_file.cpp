// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/atomic_file.h"

#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cerrno>
#include <cstdio>
#include <string>
#include <system_error>
#include <utility>

#include "base/error.h"

namespace foreglow {
namespace {

constexpr mode_t new_file_mode = 0666;  // the caller's umask takes away from it

/// Makes the rename itself durable; a file system that cannot sync a folder is no reason to fail.
void sync_folder(const AtomicFile& file) {
    const auto folder =
        file.path().has_parent_path() ? file.path().parent_path() : std::filesystem::path(".");
    const int descriptor = ::open(folder.c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC);
    if (descriptor < 0) return;
    const int status = ::fsync(descriptor);
    const int reason = errno;
    ::close(descriptor);
    if (status != 0 && reason == EIO) file.fail("write", reason);
}

}  // namespace

std::string system_reason(int error_number) {
    return std::generic_category().message(error_number);
}

AtomicFile::AtomicFile(std::filesystem::path path) : path_(std::move(path)), part_path_(path_) {
    part_path_ += ".part";
    descriptor_ = ::open(part_path_.c_str(), O_RDWR | O_CREAT | O_TRUNC | O_CLOEXEC, new_file_mode);
    if (descriptor_ < 0) fail("create", errno);
}

AtomicFile::~AtomicFile() {
    if (descriptor_ >= 0) ::close(descriptor_);
    if (!committed_) ::unlink(part_path_.c_str());
}

void AtomicFile::fail(std::string_view action, int error_number) const {
    std::string message = "cannot ";
    message.append(action)
        .append(" ")
        .append(path_.string())
        .append(": ")
        .append(system_reason(error_number));
    if (error_number == ENOSPC || error_number == EDQUOT) message += "; free some space or write elsewhere";
    throw FileError(message);
}

void AtomicFile::write_at(std::int64_t offset, std::span<const std::byte> bytes) {
    while (!bytes.empty()) {
        const ssize_t done = ::pwrite(descriptor_, bytes.data(), bytes.size(), offset);
        if (done < 0 && errno == EINTR) continue;
        if (done < 0) fail("write", errno);
        if (done == 0) fail("write", ENOSPC);
        offset += done;
        bytes = bytes.subspan(static_cast<std::size_t>(done));
    }
}

void AtomicFile::set_length(std::int64_t bytes) {
    if (::ftruncate(descriptor_, bytes) != 0) fail("write", errno);
}

void AtomicFile::reserve(std::int64_t bytes) {
    int status = EINTR;
    while (status == EINTR)
        status = ::posix_fallocate(descriptor_, 0, bytes);
    if (status != 0) fail("write", status);
}

void AtomicFile::commit() {
    FOREGLOW_EXPECTS(descriptor_ >= 0);
    if (::fsync(descriptor_) != 0) fail("write", errno);
    // Some file systems report a full disk only here.
    if (::close(std::exchange(descriptor_, -1)) != 0) fail("write", errno);
    if (std::rename(part_path_.c_str(), path_.c_str()) != 0) fail("rename the finished file to", errno);
    committed_ = true;
    sync_folder(*this);
}

void write_text_file(const std::filesystem::path& path, std::string_view text) {
    AtomicFile file(path);
    file.write_at(0, std::as_bytes(std::span(text)));
    file.commit();
}

}  // namespace foreglow
