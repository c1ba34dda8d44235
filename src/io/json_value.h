// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <string>
#include <utility>
#include <variant>
#include <vector>

namespace foreglow {

/// A JSON value; objects keep the order in which their keys were added.
class JsonValue {
  public:
    using Array = std::vector<JsonValue>;
    using Object = std::vector<std::pair<std::string, JsonValue>>;

    JsonValue() = default;                      ///< null
    JsonValue(bool value) : value_(value) {}    // NOLINT(google-explicit-constructor): values read as JSON
    JsonValue(double value) : value_(value) {}  // NOLINT(google-explicit-constructor)
    JsonValue(std::int64_t value) : value_(value) {}              // NOLINT(google-explicit-constructor)
    JsonValue(int value) : value_(std::int64_t{value}) {}         // NOLINT(google-explicit-constructor)
    JsonValue(std::uint64_t value) : value_(value) {}             // NOLINT(google-explicit-constructor)
    JsonValue(std::string value) : value_(std::move(value)) {}    // NOLINT(google-explicit-constructor)
    JsonValue(const char* value) : value_(std::string(value)) {}  // NOLINT(google-explicit-constructor)
    JsonValue(Array value) : value_(std::move(value)) {}          // NOLINT(google-explicit-constructor)
    JsonValue(Object value) : value_(std::move(value)) {}         // NOLINT(google-explicit-constructor)

    [[nodiscard]] bool is_null() const { return std::holds_alternative<std::monostate>(value_); }
    [[nodiscard]] const std::string* text() const { return std::get_if<std::string>(&value_); }
    [[nodiscard]] const Array* array() const { return std::get_if<Array>(&value_); }
    /// Returns a member of an object, or null where this is no object or has none of that key.
    [[nodiscard]] const JsonValue* find(const std::string& key) const;

    using Storage =
        std::variant<std::monostate, bool, double, std::int64_t, std::uint64_t, std::string, Array, Object>;
    [[nodiscard]] const Storage& storage() const { return value_; }

  private:
    Storage value_;
};

/// Writes JSON with two blanks a level and the shortest form of each number; not-a-number and infinities
/// become null.
[[nodiscard]] std::string write_json(const JsonValue& value);

/// Reads a JSON file.
/// @throws FileError where it cannot be read, DataError where it is no JSON
[[nodiscard]] JsonValue read_json(const std::filesystem::path& path);

}  // namespace foreglow
