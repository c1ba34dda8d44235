// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <string>
#include <vector>

namespace foreglow {

/// Refuses a folder that exists and is not empty, unless it may be replaced, and a path that is no folder.
/// @throws InputError with what to do
void check_output_folder(const std::filesystem::path& folder, bool replace);

/// The folder of a run: it makes subfolders, remembers what was written, and takes all of it back when the
/// run fails.
class OutputFolder {
  public:
    /// Makes the folder; with replace, removes what an earlier run says it left there (its manifest first, so
    /// that nothing stale is taken for new); other files are left alone.
    /// @throws FileError with the system's reason
    OutputFolder(std::filesystem::path folder, bool replace);
    /// Removes what this run wrote unless keep() was called.
    ~OutputFolder();
    OutputFolder(const OutputFolder&) = delete;
    OutputFolder& operator=(const OutputFolder&) = delete;

    /// Returns the full path of "maps/x.fits"; its folder exists then.
    [[nodiscard]] std::filesystem::path prepare(const std::string& name);
    [[nodiscard]] const std::filesystem::path& path() const { return folder_; }
    void keep() { kept_ = true; }

  private:
    void remove_earlier_run();

    std::filesystem::path folder_;
    std::vector<std::filesystem::path> written_, made_folders_;
    bool kept_ = false;
};

}  // namespace foreglow
