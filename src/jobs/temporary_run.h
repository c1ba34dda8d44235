// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>

namespace foreglow {

/// A folder of its own among the temporary ones, taken away with all that is in it.
class TemporaryRun {
  public:
    /// @throws FileError where none can be made
    TemporaryRun();
    ~TemporaryRun();
    TemporaryRun(const TemporaryRun&) = delete;
    TemporaryRun& operator=(const TemporaryRun&) = delete;
    [[nodiscard]] const std::filesystem::path& path() const { return path_; }

  private:
    std::filesystem::path path_;
};

}  // namespace foreglow
