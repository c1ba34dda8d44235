// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "io/toml_document.h"

namespace foreglow {

/// Reads a table key by key and remembers which keys were asked for, so that the rest are known to be wrong.
///
/// Every message names the place, the key and the section, what was found and what is wanted, with an
/// example. The table must outlive the reader.
class TomlReader {
  public:
    /// @param section  for messages: "" for the top of a file, "[intensity]", "[[channel]] 'low'"
    explicit TomlReader(const TomlValue& table, std::string section = "");

    /// Returns the value of a key, or nullptr.
    [[nodiscard]] const TomlValue* find(const std::string& key);
    [[nodiscard]] bool has(const std::string& key) { return find(key) != nullptr; }

    /// Return the value of a key, or nothing where the key is absent; `example` is the line to show: nside =
    /// 256.
    /// @throws InputError where the value has another type; numbers must be finite
    [[nodiscard]] std::optional<std::string> text(const std::string& key, const std::string& example);
    [[nodiscard]] std::optional<std::int64_t> integer(const std::string& key, const std::string& example);
    [[nodiscard]] std::optional<double> number(const std::string& key, const std::string& example);
    [[nodiscard]] std::optional<bool> boolean(const std::string& key);

    /// Return readers of the table `[key]` or the tables `[[key]]`.
    [[nodiscard]] std::optional<TomlReader> table(const std::string& key);
    [[nodiscard]] std::vector<TomlReader> tables(const std::string& key);

    /// Checks that the table holds no key but those asked for so far; names the nearest of them.
    /// @throws InputError
    void check_no_other_keys() const;

    /// Throws InputError "PLACE: 'key' in SECTION MESSAGE", the place being the value's, or the section's
    /// where it is absent.
    [[noreturn]] void fail(const std::string& key, const std::string& message) const;
    /// Throws InputError "PLACE: MESSAGE" at the section's own place.
    [[noreturn]] void fail_here(const std::string& message) const;
    /// Throws InputError that says that a required key is missing and which line to add.
    [[noreturn]] void fail_missing(const std::string& key, const std::string& example) const;

    [[nodiscard]] const std::string& section() const { return section_; }
    void set_section(std::string section) { section_ = std::move(section); }
    [[nodiscard]] const std::string& place() const { return table_->place; }
    /// Returns the place of a key's value, or the section's where it is absent.
    [[nodiscard]] std::string place_of(const std::string& key) const;

  private:
    [[noreturn]] void fail_type(const std::string& key, const TomlValue& value, const std::string& wanted,
                                const std::string& example) const;

    const TomlValue* table_;
    std::string section_;
    std::vector<std::string> asked_;
};

}  // namespace foreglow
