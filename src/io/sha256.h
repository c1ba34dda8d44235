// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <span>

namespace foreglow {

/// Computes SHA-256 (FIPS 180-4, section 6.2) over bytes that come piece by piece.
class Sha256 {
  public:
    using Digest = std::array<std::uint8_t, 32>;

    void add(std::span<const std::byte> bytes);
    /// Returns the digest of all bytes added; nothing may be added afterwards.
    [[nodiscard]] Digest finish();

  private:
    std::array<std::uint32_t, 8> state_{0x6a09e667, 0xbb67ae85, 0x3c6ef372, 0xa54ff53a,
                                        0x510e527f, 0x9b05688c, 0x1f83d9ab, 0x5be0cd19};
    std::array<std::byte, 64> pending_{};
    std::size_t pending_bytes_ = 0;
    std::uint64_t total_bytes_ = 0;
};

}  // namespace foreglow
