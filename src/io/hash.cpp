// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/hash.h"

#include <fcntl.h>
#include <nettle/sha2.h>
#include <sys/mman.h>
#include <sys/stat.h>
#include <unistd.h>
#include <xxhash.h>

#include <algorithm>
#include <array>
#include <cerrno>
#include <cstdint>
#include <memory>
#include <vector>

#include "base/error.h"
#include "io/atomic_file.h"

namespace foreglow {
namespace {

constexpr std::size_t stream_bytes = std::size_t{1} << 18;  // fits the second-level cache
constexpr off_t window_bytes = off_t{1} << 26;              // mapped at once

std::string to_hex(std::span<const std::uint8_t> bytes) {
    static constexpr char digits[] = "0123456789abcdef";
    std::string text;
    for (const std::uint8_t byte : bytes) {
        text += digits[byte >> 4];
        text += digits[byte & 15];
    }
    return text;
}

[[noreturn]] void fail_reading(const std::filesystem::path& path, int error_number) {
    throw FileError("cannot read " + path.string() + ": " + system_reason(error_number));
}

/// SHA-256 of bytes that come in pieces.
class Sha256 {
  public:
    Sha256() { sha256_init(&context_); }
    void add(std::span<const std::byte> bytes) {
        sha256_update(&context_, bytes.size(), reinterpret_cast<const std::uint8_t*>(bytes.data()));
    }
    [[nodiscard]] std::string finish() {
        std::array<std::uint8_t, SHA256_DIGEST_SIZE> digest{};
        sha256_digest(&context_, digest.size(), digest.data());
        return to_hex(digest);
    }

  private:
    sha256_ctx context_{};
};

/// A file, open for reading.
class OpenFile {
  public:
    explicit OpenFile(const std::filesystem::path& path)
        : path_(path), descriptor_(::open(path.c_str(), O_RDONLY | O_CLOEXEC)) {
        if (descriptor_ < 0) fail_reading(path_, errno);
    }
    OpenFile(const OpenFile&) = delete;
    OpenFile& operator=(const OpenFile&) = delete;
    ~OpenFile() { ::close(descriptor_); }

    /// Calls use(bytes) on the pieces of the file, in order.
    template <class Use>
    void stream(const Use& use) const {
        std::vector<std::byte> buffer(stream_bytes);
        for (;;) {
            const ssize_t got = ::read(descriptor_, buffer.data(), buffer.size());
            if (got < 0 && errno == EINTR) continue;
            if (got < 0) fail_reading(path_, errno);
            if (got == 0) return;
            use(std::span<const std::byte>(buffer).first(static_cast<std::size_t>(got)));
        }
    }

    /// The same out of the system's own pages, without a copy; only for files that nobody cuts meanwhile.
    template <class Use>
    void stream_mapped(const Use& use) const {
        struct stat status {};
        if (::fstat(descriptor_, &status) != 0) fail_reading(path_, errno);
        for (off_t done = 0; done < status.st_size;) {
            const auto count = static_cast<std::size_t>(std::min<off_t>(status.st_size - done, window_bytes));
            void* const address =
                ::mmap(nullptr, count, PROT_READ, MAP_SHARED | MAP_POPULATE, descriptor_, done);
            if (address == MAP_FAILED) fail_reading(path_, errno);
            use(std::span(static_cast<const std::byte*>(address), count));
            ::munmap(address, count);
            done += static_cast<off_t>(count);
        }
    }

  private:
    const std::filesystem::path& path_;
    int descriptor_;
};

}  // namespace

std::string sha256_of_bytes(std::span<const std::byte> bytes) {
    Sha256 sum;
    sum.add(bytes);
    return sum.finish();
}

std::string sha256_of_file(const std::filesystem::path& path) {
    Sha256 sum;
    OpenFile(path).stream([&](std::span<const std::byte> bytes) { sum.add(bytes); });
    return sum.finish();
}

namespace {

// Streams into one XXH3-128: `feed` calls add(bytes) on the pieces in order.
template <class Feed>
std::string xxh3_128_of(const Feed& feed) {
    const std::unique_ptr<XXH3_state_t, decltype(&XXH3_freeState)> state(XXH3_createState(), XXH3_freeState);
    if (!state || XXH3_128bits_reset(state.get()) != XXH_OK) throw std::bad_alloc();
    feed([&](std::span<const std::byte> bytes) {
        XXH3_128bits_update(state.get(), bytes.data(), bytes.size());
    });
    XXH128_canonical_t canonical;
    XXH128_canonicalFromHash(&canonical, XXH3_128bits_digest(state.get()));
    return to_hex(canonical.digest);
}

}  // namespace

std::string xxh3_128_of_file(const std::filesystem::path& path) {
    return xxh3_128_of([&](const auto& add) { OpenFile(path).stream_mapped(add); });
}

std::string xxh3_128_of_pieces(std::span<const std::span<const std::byte>> pieces) {
    return xxh3_128_of([&](const auto& add) {
        for (const std::span<const std::byte> piece : pieces)
            add(piece);
    });
}

}  // namespace foreglow
