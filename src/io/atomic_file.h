// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>
#include <cstdint>
#include <filesystem>
#include <span>
#include <string_view>

namespace foreglow {

/// Writes a file as NAME.part in the same folder and gives it its name only when all of it is safely on disk.
///
/// A reader therefore sees the whole file or none. Without commit() the destructor removes NAME.part.
class AtomicFile {
  public:
    /// Creates NAME.part, emptied if it was there; the folder must exist.
    /// @throws FileError with the system's reason
    explicit AtomicFile(std::filesystem::path path);
    ~AtomicFile();
    AtomicFile(const AtomicFile&) = delete;
    AtomicFile& operator=(const AtomicFile&) = delete;

    [[nodiscard]] const std::filesystem::path& path() const { return path_; }
    [[nodiscard]] const std::filesystem::path& part_path() const { return part_path_; }
    /// Returns the open descriptor of NAME.part, for reading and writing.
    [[nodiscard]] int descriptor() const { return descriptor_; }

    /// Writes bytes at an offset; several threads may write at once.
    /// @throws FileError with the system's reason, as when the disk is full
    void write_at(std::int64_t offset, std::span<const std::byte> bytes);

    /// Sets the file's length; bytes not yet written are zero.
    /// @throws FileError with the system's reason
    void set_length(std::int64_t bytes);

    /// Sets the file's length and takes the disk space for it now.
    /// @throws FileError with the system's reason, as when the disk is full
    void reserve(std::int64_t bytes);

    /// Syncs, closes, and renames NAME.part to NAME, then syncs the folder; every status is checked.
    /// @throws FileError with the system's reason; NAME.part is then removed by the destructor
    void commit();

    /// Throws the FileError "cannot <action> <path>: <reason>".
    [[noreturn]] void fail(std::string_view action, int error_number) const;

  private:
    std::filesystem::path path_, part_path_;
    int descriptor_ = -1;
    bool committed_ = false;
};

/// Writes a text file whole (JSON, HTML, CSV), through AtomicFile.
/// @throws FileError with the system's reason
void write_text_file(const std::filesystem::path& path, std::string_view text);

/// Returns the system's words for an error number: "No space left on device".
[[nodiscard]] std::string system_reason(int error_number);

}  // namespace foreglow
