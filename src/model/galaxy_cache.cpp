// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_cache.h"

#include <unistd.h>

#include <algorithm>
#include <cstdlib>
#include <fstream>
#include <span>
#include <sstream>

#include "base/error.h"
#include "base/text.h"
#include "io/atomic_file.h"
#include "io/hash.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;

constexpr const char* first_line = "foreglow galaxy 1";
constexpr const char* prefix = "galaxy-";
constexpr const char* suffix = ".maps";
constexpr std::size_t most_header_bytes = std::size_t{1} << 20;

std::vector<std::span<const std::byte>> pieces_of(const CachedGalaxy& entry) {
    std::vector<std::span<const std::byte>> pieces;
    pieces.reserve(entry.maps.size());
    for (const auto& map : entry.maps)
        pieces.push_back(std::as_bytes(std::span(map)));
    return pieces;
}

// The header's lines: numbers first, then the key to an empty line.
std::string make_header(const std::string& key, const CachedGalaxy& entry) {
    const std::size_t values = entry.maps.empty() ? 0 : entry.maps.front().size();
    std::ostringstream text;
    text << first_line << '\n'
         << entry.maps.size() << ' ' << values << ' ' << entry.sampling.steps_near_plane << ' '
         << entry.sampling.steps_elsewhere << ' ' << format_exact(entry.sampling.error) << ' '
         << entry.coarse_pixels << ' ' << xxh3_128_of_pieces(pieces_of(entry)) << '\n'
         << key.size() << '\n'
         << key << '\n';
    return text.str();
}

bool is_entry(const fs::directory_entry& file) {
    const std::string name = file.path().filename().string();
    std::error_code code;
    return name.starts_with(prefix) && name.find(suffix) != std::string::npos && file.is_regular_file(code);
}

std::vector<fs::directory_entry> list_entries(const fs::path& folder) {
    std::vector<fs::directory_entry> entries;
    std::error_code code;
    for (fs::directory_iterator it(folder, code), end; !code && it != end; it.increment(code))
        if (is_entry(*it)) entries.push_back(*it);
    return entries;
}

std::uintmax_t bytes_of(const fs::directory_entry& file) {
    std::error_code code;
    const std::uintmax_t bytes = file.file_size(code);
    return code ? 0 : bytes;
}

// Another run may remove the same files: what is gone is gone.
void remove_oldest(const fs::path& folder, const fs::path& keep) {
    std::vector<fs::directory_entry> entries = list_entries(folder);
    std::error_code code;
    const auto age = [&](const fs::directory_entry& file) { return file.last_write_time(code); };
    std::sort(entries.begin(), entries.end(), [&](const auto& a, const auto& b) { return age(a) < age(b); });
    std::uintmax_t total = 0;
    for (const auto& file : entries)
        total += bytes_of(file);
    for (const auto& file : entries) {
        if (total <= largest_cache_bytes) return;
        if (file.path() == keep) continue;
        total -= bytes_of(file);
        fs::remove(file.path(), code);
    }
}

struct Header {
    std::size_t maps = 0, values = 0;
    CachedGalaxy entry;
    std::string hash, key;
};

std::optional<Header> read_header(std::istream& file) {
    Header header;
    std::string line;
    std::size_t key_bytes = 0;
    if (!std::getline(file, line) || line != first_line) return std::nullopt;
    file >> header.maps >> header.values >> header.entry.sampling.steps_near_plane >>
        header.entry.sampling.steps_elsewhere >> header.entry.sampling.error >> header.entry.coarse_pixels >>
        header.hash >> key_bytes;
    if (!file || key_bytes > most_header_bytes) return std::nullopt;
    file.get();
    header.key.resize(key_bytes);
    file.read(header.key.data(), static_cast<std::streamsize>(key_bytes));
    file.get();
    if (!file) return std::nullopt;
    return header;
}

}  // namespace

fs::path GalaxyCache::file_of(const std::string& key) const {
    return folder_ / (prefix + sha256_of_bytes(std::as_bytes(std::span(key))).substr(0, 32) + suffix);
}

std::optional<CachedGalaxy> GalaxyCache::read(const std::string& key) const {
    const fs::path path = file_of(key);
    std::error_code code;
    const std::uintmax_t size = fs::file_size(path, code);
    if (code) return std::nullopt;
    std::ifstream file(path, std::ios::binary);
    std::optional<Header> header = read_header(file);
    if (!header || header->key != key) return std::nullopt;
    const auto begin = static_cast<std::uintmax_t>(file.tellg());
    const std::uintmax_t payload = size - begin;
    if (header->maps == 0 || payload % (header->maps * sizeof(double)) != 0 ||
        payload / (header->maps * sizeof(double)) != header->values)
        return std::nullopt;
    for (std::size_t m = 0; m < header->maps; ++m) {
        std::vector<double> map(header->values);
        file.read(reinterpret_cast<char*>(map.data()),
                  static_cast<std::streamsize>(map.size() * sizeof(double)));
        if (!file) return std::nullopt;
        header->entry.maps.push_back(std::move(map));
    }
    if (xxh3_128_of_pieces(pieces_of(header->entry)) != header->hash) return std::nullopt;
    fs::last_write_time(path, fs::file_time_type::clock::now(), code);  // so that it is not the oldest
    return std::move(header->entry);
}

void GalaxyCache::write(const std::string& key, const CachedGalaxy& entry) const {
    std::error_code code;
    fs::create_directories(folder_, code);
    if (code) throw FileError("cannot make the folder " + folder_.string() + ": " + code.message());
    const fs::path path = file_of(key);
    const fs::path own = path.string() + "." + std::to_string(::getpid());
    const std::string header = make_header(key, entry);
    {
        AtomicFile file(own);
        std::int64_t offset = 0;
        const auto add = [&](std::span<const std::byte> bytes) {
            file.write_at(offset, bytes);
            offset += static_cast<std::int64_t>(bytes.size());
        };
        add(std::as_bytes(std::span(header)));
        for (const std::span<const std::byte> piece : pieces_of(entry))
            add(piece);
        file.commit();
    }
    fs::rename(own, path, code);
    if (code) {
        const std::string reason = code.message();
        fs::remove(own, code);
        throw FileError("cannot rename " + own.string() + ": " + reason);
    }
    remove_oldest(folder_, path);
}

std::optional<fs::path> default_cache_folder() {
    const auto from = [](const char* variable) {
        const char* const value = std::getenv(variable);
        return value != nullptr && *value == '/' ? std::optional<fs::path>(value) : std::nullopt;
    };
    if (const auto cache = from("XDG_CACHE_HOME")) return *cache / "foreglow";
    if (const auto home = from("HOME")) return *home / ".cache" / "foreglow";
    return std::nullopt;
}

CacheSize measure_cache(const fs::path& folder) {
    CacheSize size;
    for (const auto& file : list_entries(folder)) {
        ++size.entries;
        size.bytes += bytes_of(file);
    }
    return size;
}

CacheSize clear_cache(const fs::path& folder) {
    CacheSize size;
    for (const auto& file : list_entries(folder)) {
        const std::uintmax_t bytes = bytes_of(file);
        std::error_code code;
        fs::remove(file.path(), code);
        if (code) throw FileError("cannot remove " + file.path().string() + ": " + code.message());
        ++size.entries;
        size.bytes += bytes;
    }
    return size;
}

}  // namespace foreglow
