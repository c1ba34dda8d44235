// SPDX-License-Identifier: GPL-2.0-or-later
#include "raw_files.h"

#include <fcntl.h>
#include <unistd.h>

#include <algorithm>
#include <memory>
#include <stdexcept>
#include <string>

#include "base/parallel.h"

namespace foreglow::benchmarks {
namespace {

constexpr std::int64_t block =
    1 << 20;  // bytes: large enough for the system call, small enough for the second-level cache

class Descriptor {
  public:
    Descriptor(const std::filesystem::path& path, int flags) : fd_(::open(path.c_str(), flags, 0644)) {
        if (fd_ < 0) throw std::runtime_error("cannot open " + path.string());
    }
    ~Descriptor() { ::close(fd_); }
    Descriptor(const Descriptor&) = delete;
    Descriptor& operator=(const Descriptor&) = delete;
    [[nodiscard]] int get() const { return fd_; }

  private:
    int fd_;
};

void require(bool done, const char* what) {
    if (!done) throw std::runtime_error(std::string("raw file: cannot ") + what);
}

}  // namespace

void write_raw_file(const std::filesystem::path& path, std::int64_t bytes, bool sync) {
    static const std::vector<char> values(block, 'x');
    const std::filesystem::path part = path.string() + ".part";
    {
        const Descriptor file(part, O_WRONLY | O_CREAT | O_TRUNC);
        for (std::int64_t at = 0; at < bytes; at += block) {
            const auto count = std::min(block, bytes - at);
            require(::pwrite(file.get(), values.data(), static_cast<std::size_t>(count), at) == count,
                    "write");
        }
        if (sync) require(::fsync(file.get()) == 0, "sync");
    }
    std::filesystem::rename(part, path);
}

void read_raw_file(const std::filesystem::path& path, char* out) {
    const auto bytes = static_cast<std::int64_t>(std::filesystem::file_size(path));
    const Descriptor file(path, O_RDONLY);
    parallel_for_blocks(bytes, block, [&](std::int64_t begin, std::int64_t end) {
        require(::pread(file.get(), out + begin, static_cast<std::size_t>(end - begin), begin) == end - begin,
                "read");
    });
}

std::vector<char> read_raw_file(const std::filesystem::path& path) {
    std::vector<char> out(std::filesystem::file_size(path));
    read_raw_file(path, out.data());
    return out;
}

}  // namespace foreglow::benchmarks
