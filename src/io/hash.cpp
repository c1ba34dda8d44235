// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/hash.h"

#include <fcntl.h>
#include <unistd.h>
#include <xxhash.h>

#include <cerrno>
#include <cstdint>
#include <memory>
#include <vector>

#include "base/error.h"
#include "io/atomic_file.h"
#include "io/sha256.h"

namespace foreglow {
namespace {

constexpr std::size_t stream_bytes = std::size_t{1} << 18;  // fits the second-level cache

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

/// Calls use(bytes) on the pieces of a file, in order.
template <class Use>
void stream_file(const std::filesystem::path& path, const Use& use) {
    struct Descriptor {
        int value;
        ~Descriptor() {
            if (value >= 0) ::close(value);
        }
    };
    const Descriptor file{::open(path.c_str(), O_RDONLY | O_CLOEXEC)};
    if (file.value < 0) fail_reading(path, errno);
    std::vector<std::byte> buffer(stream_bytes);
    for (;;) {
        const ssize_t got = ::read(file.value, buffer.data(), buffer.size());
        if (got < 0 && errno == EINTR) continue;
        if (got < 0) fail_reading(path, errno);
        if (got == 0) return;
        use(std::span<const std::byte>(buffer).first(static_cast<std::size_t>(got)));
    }
}

}  // namespace

std::string sha256_of_bytes(std::span<const std::byte> bytes) {
    Sha256 sum;
    sum.add(bytes);
    return to_hex(sum.finish());
}

std::string sha256_of_file(const std::filesystem::path& path) {
    Sha256 sum;
    stream_file(path, [&](std::span<const std::byte> bytes) { sum.add(bytes); });
    return to_hex(sum.finish());
}

std::string xxh3_128_of_file(const std::filesystem::path& path) {
    const std::unique_ptr<XXH3_state_t, decltype(&XXH3_freeState)> state(XXH3_createState(), XXH3_freeState);
    if (!state || XXH3_128bits_reset(state.get()) != XXH_OK) throw std::bad_alloc();
    stream_file(path, [&](std::span<const std::byte> bytes) {
        XXH3_128bits_update(state.get(), bytes.data(), bytes.size());
    });
    XXH128_canonical_t canonical;
    XXH128_canonicalFromHash(&canonical, XXH3_128bits_digest(state.get()));
    return to_hex(canonical.digest);
}

}  // namespace foreglow
