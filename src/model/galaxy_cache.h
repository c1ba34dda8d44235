// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "model/galaxy_sampling.h"

namespace foreglow {

/// Maps of the Galaxy that were integrated once.
struct CachedGalaxy {
    std::vector<std::vector<double>> maps;  ///< all of one length
    GalaxySampling sampling;
    std::int64_t coarse_pixels = 0;  ///< GalaxyStokes
};

/// Keeps integrated maps in a folder, so that a study run again need not integrate again.
///
/// An entry is a file named by the SHA-256 of its key, which says all that the maps depend on; the key stands
/// in it too. It is written under a name of this process' own, synced, and renamed, so that runs at the same
/// time do not disturb one another. An entry that is broken in any way counts as absent.
class GalaxyCache {
  public:
    explicit GalaxyCache(std::filesystem::path folder) : folder_(std::move(folder)) {}

    [[nodiscard]] std::optional<CachedGalaxy> read(const std::string& key) const;
    /// Writes an entry, then removes the oldest ones while all together exceed largest_cache_bytes.
    /// @throws FileError with the system's reason
    void write(const std::string& key, const CachedGalaxy& entry) const;

    [[nodiscard]] const std::filesystem::path& folder() const { return folder_; }
    /// Returns the file of a key.
    [[nodiscard]] std::filesystem::path file_of(const std::string& key) const;

  private:
    std::filesystem::path folder_;
};

inline constexpr std::uintmax_t largest_cache_bytes = std::uintmax_t{4} << 30U;

/// Returns $XDG_CACHE_HOME/foreglow, else ~/.cache/foreglow; nothing where neither variable says a folder.
[[nodiscard]] std::optional<std::filesystem::path> default_cache_folder();

struct CacheSize {
    std::int64_t entries = 0;
    std::uintmax_t bytes = 0;
};
/// Returns how much a cache folder holds; nothing is there where the folder is not.
[[nodiscard]] CacheSize measure_cache(const std::filesystem::path& folder);
/// Removes the entries of a cache folder, and no other file, and returns what they were.
/// @throws FileError with the system's reason
CacheSize clear_cache(const std::filesystem::path& folder);

}  // namespace foreglow
