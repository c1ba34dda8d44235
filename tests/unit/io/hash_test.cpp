// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/hash.h"

#include <gtest/gtest.h>
#include <xxhash.h>

#include <array>
#include <cstdio>

#include "base/error.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

using testing::TemporaryFolder;
using testing::write_whole_file;

std::string sha256_of_text(const std::string& text) {
    return sha256_of_bytes(std::as_bytes(std::span(text)));
}

// From outside: FIPS 180-4's examples of one and two blocks and of a million letters a (NIST, Secure Hash
// Standard example values); the empty message is from the same collection.
TEST(Sha256, GivesThePublishedDigests) {
    EXPECT_EQ(sha256_of_text("abc"), "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    EXPECT_EQ(sha256_of_text("abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq"),
              "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
    EXPECT_EQ(sha256_of_text(std::string(1000000, 'a')),
              "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0");
    EXPECT_EQ(sha256_of_text(""), "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
}

// From outside: Python's hashlib on b'x' * n, for the lengths around the padding's own edges.
TEST(Sha256, PadsEveryLengthRight) {
    EXPECT_EQ(sha256_of_text(std::string(55, 'x')),
              "d5e285683cd4efc02d021a5c62014694958901005d6f71e89e0989fac77e4072");
    EXPECT_EQ(sha256_of_text(std::string(56, 'x')),
              "04c26261370ee7541549d16dee320c723e3fd14671e66a099afe0a377c16888e");
    EXPECT_EQ(sha256_of_text(std::string(63, 'x')),
              "75220b47218278e656f2013bb8f0c455a25eaf01e86c64924e9d48d89776d6f2");
    EXPECT_EQ(sha256_of_text(std::string(64, 'x')),
              "7ce100971f64e7001e8fe5a51973ecdfe1ced42befe7ee8d5fd6219506b5393c");
    EXPECT_EQ(sha256_of_text(std::string(119, 'x')),
              "000b48d4edf0fa7bee3c6236ecd2785baa5db4eeb8bb54341b029e0d9fa5fb0c");
}

TEST(Sha256, OfAFileIsThatOfItsBytes) {
    const TemporaryFolder folder;
    std::string text;
    for (int i = 0; i < 1000003; ++i)
        text += static_cast<char>(i * 7 + i / 251);
    write_whole_file(folder / "a", text);
    EXPECT_EQ(sha256_of_file(folder / "a"), sha256_of_text(text));
    write_whole_file(folder / "none", "");
    EXPECT_EQ(sha256_of_file(folder / "none"), sha256_of_text(""));
}

// From outside: XXH3_128bits with seed 0 of nothing and of 'abc', as commonly listed (from memory); the
// library's own call on a whole buffer is the other way to the same number.
TEST(Xxh3, GivesTheKnownDigestsAndStreamsLikeOneCall) {
    const TemporaryFolder folder;
    write_whole_file(folder / "none", "");
    EXPECT_EQ(xxh3_128_of_file(folder / "none"), "99aa06d3014798d86001c324468d497f");
    write_whole_file(folder / "abc", "abc");
    EXPECT_EQ(xxh3_128_of_file(folder / "abc"), "06b05ab6733a618578af5f94892f3950");
    std::string text;
    for (int i = 0; i < 1000003; ++i)
        text += static_cast<char>(i * 7 + i / 251);
    write_whole_file(folder / "long", text);
    const XXH128_hash_t whole = XXH3_128bits(text.data(), text.size());
    char digits[33] = {};
    std::snprintf(digits, sizeof digits, "%016llx%016llx", static_cast<unsigned long long>(whole.high64),
                  static_cast<unsigned long long>(whole.low64));
    EXPECT_EQ(xxh3_128_of_file(folder / "long"), digits);
}

TEST(Hash, OfAFileThatIsNotThereIsAFileErrorWithTheReason) {
    const TemporaryFolder folder;
    for (const auto hash : {sha256_of_file, xxh3_128_of_file}) {
        try {
            static_cast<void>(hash(folder / "absent"));
            ADD_FAILURE() << "no error";
        } catch (const FileError& error) {
            EXPECT_NE(std::string(error.what()).find("absent: No such file"), std::string::npos)
                << error.what();
        }
        EXPECT_THROW(static_cast<void>(hash(folder.path())), FileError);  // a folder opens, but does not read
    }
}

TEST(Xxh3, OfPiecesIsThatOfTheFileTheyMake) {
    const TemporaryFolder folder;
    const std::string text = "one two three";
    write_whole_file(folder.path() / "whole", text);
    const auto bytes = std::as_bytes(std::span(text));
    const std::array pieces{bytes.first(4), bytes.subspan(4)};
    EXPECT_EQ(xxh3_128_of_pieces(pieces), xxh3_128_of_file(folder.path() / "whole"));
}

}  // namespace
}  // namespace foreglow
