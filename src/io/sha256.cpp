// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/sha256.h"

#include <algorithm>
#include <bit>
#include <cstring>

namespace foreglow {
namespace {

constexpr std::size_t block_bytes = 64;
constexpr std::size_t length_bytes = 8;  // the message length in bits closes the last block

// FIPS 180-4, section 4.2.2: the first 32 bits of the fractional parts of the cube roots of the first 64
// primes.
constexpr std::array<std::uint32_t, 64> round_constants = {
    0x428a2f98, 0x71374491, 0xb5c0fbcf, 0xe9b5dba5, 0x3956c25b, 0x59f111f1, 0x923f82a4, 0xab1c5ed5,
    0xd807aa98, 0x12835b01, 0x243185be, 0x550c7dc3, 0x72be5d74, 0x80deb1fe, 0x9bdc06a7, 0xc19bf174,
    0xe49b69c1, 0xefbe4786, 0x0fc19dc6, 0x240ca1cc, 0x2de92c6f, 0x4a7484aa, 0x5cb0a9dc, 0x76f988da,
    0x983e5152, 0xa831c66d, 0xb00327c8, 0xbf597fc7, 0xc6e00bf3, 0xd5a79147, 0x06ca6351, 0x14292967,
    0x27b70a85, 0x2e1b2138, 0x4d2c6dfc, 0x53380d13, 0x650a7354, 0x766a0abb, 0x81c2c92e, 0x92722c85,
    0xa2bfe8a1, 0xa81a664b, 0xc24b8b70, 0xc76c51a3, 0xd192e819, 0xd6990624, 0xf40e3585, 0x106aa070,
    0x19a4c116, 0x1e376c08, 0x2748774c, 0x34b0bcb5, 0x391c0cb3, 0x4ed8aa4a, 0x5b9cca4f, 0x682e6ff3,
    0x748f82ee, 0x78a5636f, 0x84c87814, 0x8cc70208, 0x90befffa, 0xa4506ceb, 0xbef9a3f7, 0xc67178f2};

std::uint32_t load_big_endian(const std::byte* at) {
    std::uint32_t word = 0;
    std::memcpy(&word, at, sizeof word);
    return __builtin_bswap32(word);
}

/// The compression function of section 6.2.2, on whole blocks.
void compress(std::array<std::uint32_t, 8>& state, std::span<const std::byte> blocks) {
    for (std::size_t start = 0; start < blocks.size(); start += block_bytes) {
        std::array<std::uint32_t, 64> w;
        for (std::size_t t = 0; t < 16; ++t)
            w[t] = load_big_endian(blocks.data() + start + 4 * t);
        for (std::size_t t = 16; t < 64; ++t) {
            const auto s0 = std::rotr(w[t - 15], 7) ^ std::rotr(w[t - 15], 18) ^ (w[t - 15] >> 3);
            const auto s1 = std::rotr(w[t - 2], 17) ^ std::rotr(w[t - 2], 19) ^ (w[t - 2] >> 10);
            w[t] = w[t - 16] + s0 + w[t - 7] + s1;
        }
        auto [a, b, c, d, e, f, g, h] = state;
        for (std::size_t t = 0; t < 64; ++t) {
            const auto t1 = h + (std::rotr(e, 6) ^ std::rotr(e, 11) ^ std::rotr(e, 25)) +
                            ((e & f) ^ (~e & g)) + round_constants[t] + w[t];
            const auto t2 =
                (std::rotr(a, 2) ^ std::rotr(a, 13) ^ std::rotr(a, 22)) + ((a & b) ^ (a & c) ^ (b & c));
            h = g, g = f, f = e, e = d + t1, d = c, c = b, b = a, a = t1 + t2;
        }
        const std::array<std::uint32_t, 8> added = {a, b, c, d, e, f, g, h};
        for (std::size_t i = 0; i < 8; ++i)
            state[i] += added[i];
    }
}

}  // namespace

void Sha256::add(std::span<const std::byte> bytes) {
    total_bytes_ += bytes.size();
    if (pending_bytes_ > 0) {
        const std::size_t taken = std::min(bytes.size(), block_bytes - pending_bytes_);
        std::copy_n(bytes.begin(), taken, pending_.begin() + static_cast<std::ptrdiff_t>(pending_bytes_));
        pending_bytes_ += taken;
        bytes = bytes.subspan(taken);
        if (pending_bytes_ < block_bytes) return;
        compress(state_, pending_);
    }
    const std::size_t whole = bytes.size() / block_bytes * block_bytes;
    compress(state_, bytes.first(whole));
    pending_bytes_ = bytes.size() - whole;
    std::copy_n(bytes.begin() + static_cast<std::ptrdiff_t>(whole), pending_bytes_, pending_.begin());
}

Sha256::Digest Sha256::finish() {
    const std::uint64_t bits = total_bytes_ * 8;
    const std::size_t used = pending_bytes_ + 1 + length_bytes;
    std::array<std::byte, 2 * block_bytes> tail{std::byte{0x80}};
    const std::size_t tail_bytes = (used <= block_bytes ? block_bytes : 2 * block_bytes) - pending_bytes_;
    for (std::size_t i = 0; i < length_bytes; ++i) {
        tail[tail_bytes - 1 - i] = static_cast<std::byte>(bits >> (8 * i));
    }
    add(std::span(tail).first(tail_bytes));
    Digest digest{};
    for (std::size_t i = 0; i < digest.size(); ++i) {
        digest[i] = static_cast<std::uint8_t>(state_[i / 4] >> (24 - 8 * (i % 4)));
    }
    return digest;
}

}  // namespace foreglow
