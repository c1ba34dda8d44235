// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/toml_reader.h"

#include <algorithm>
#include <cmath>
#include <utility>

#include "base/error.h"
#include "base/text.h"
#include "io/text_file.h"

namespace foreglow {

using Type = TomlValue::Type;

TomlReader::TomlReader(const TomlValue& table, std::string section)
    : table_(&table), section_(std::move(section)) {
    FOREGLOW_EXPECTS(table.type == Type::Table);
}

const TomlValue* TomlReader::find(const std::string& key) {
    if (std::find(asked_.begin(), asked_.end(), key) == asked_.end()) asked_.push_back(key);
    return find_value(*table_, key);
}

std::optional<std::string> TomlReader::text(const std::string& key, const std::string& example) {
    const TomlValue* value = find(key);
    if (value == nullptr) return std::nullopt;
    if (value->type == Type::String) return value->text;
    // --set title=2026 means the text; only a file can tell "2026" from 2026.
    if (value->from_command_line && !value->as_typed.empty() && value->type != Type::Table &&
        value->type != Type::Array)
        return value->as_typed;
    fail_type(key, *value, "a string in quotes", example);
}

std::optional<std::int64_t> TomlReader::integer(const std::string& key, const std::string& example) {
    const TomlValue* value = find(key);
    if (value == nullptr) return std::nullopt;
    if (value->type != Type::Integer) fail_type(key, *value, "a whole number", example);
    return value->integer;
}

std::optional<double> TomlReader::number(const std::string& key, const std::string& example) {
    const TomlValue* value = find(key);
    if (value == nullptr) return std::nullopt;
    const bool is_number = value->type == Type::Integer || value->type == Type::Float;
    if (!is_number || !std::isfinite(value->number)) fail_type(key, *value, "a finite number", example);
    return value->number;
}

std::optional<bool> TomlReader::boolean(const std::string& key) {
    const TomlValue* value = find(key);
    if (value == nullptr) return std::nullopt;
    if (value->type != Type::Boolean)
        fail_type(key, *value, "true or false, without quotes", key + " = true");
    return value->boolean;
}

std::optional<TomlReader> TomlReader::table(const std::string& key) {
    const TomlValue* value = find(key);
    if (value == nullptr) return std::nullopt;
    if (value->type != Type::Table) fail_type(key, *value, "a section", "[" + key + "]");
    return TomlReader(*value, "[" + key + "]");
}

std::vector<TomlReader> TomlReader::tables(const std::string& key) {
    const TomlValue* value = find(key);
    if (value == nullptr) return {};
    if (value->type != Type::Array)
        fail_type(key, *value, "a list of sections, each with two brackets", "[[" + key + "]]");
    std::vector<TomlReader> readers;
    for (const TomlValue& item : value->items) {
        if (item.type != Type::Table) fail_type(key, item, "a list of sections", "[[" + key + "]]");
        readers.emplace_back(item, "[[" + key + "]]");
    }
    return readers;
}

void TomlReader::check_no_other_keys() const {
    for (std::size_t i = 0; i < table_->keys.size(); ++i) {
        const std::string& key = table_->keys[i];
        if (std::find(asked_.begin(), asked_.end(), key) != asked_.end()) continue;
        const std::string where = section_.empty() ? "" : " in " + section_;
        const std::string nearest = nearest_word(key, asked_);
        std::string known;
        for (const std::string& word : asked_)
            known += (known.empty() ? "" : ", ") + word;
        throw InputError(
            to_one_line(table_->items[i].key_place + ": there is no key '" + key + "'" + where + ": " +
                        (nearest.empty() ? "the keys are " + known : "did you mean '" + nearest + "'?")));
    }
}

std::string TomlReader::place_of(const std::string& key) const {
    const TomlValue* value = find_value(*table_, key);
    return value != nullptr ? value->place : table_->place;
}

void TomlReader::fail(const std::string& key, const std::string& message) const {
    const std::string where = section_.empty() ? "" : " in " + section_;
    throw InputError(to_one_line(place_of(key) + ": '" + key + "'" + where + " " + message));
}

void TomlReader::fail_here(const std::string& message) const {
    throw InputError(to_one_line(place() + ": " + message));
}

void TomlReader::fail_missing(const std::string& key, const std::string& example) const {
    const std::string where = section_.empty() ? "" : " in " + section_;
    fail_here("'" + key + "' is missing" + where + ": add a line such as " + example);
}

void TomlReader::fail_type(const std::string& key, const TomlValue& value, const std::string& wanted,
                           const std::string& example) const {
    const std::string where = section_.empty() ? "" : " in " + section_;
    throw InputError(to_one_line(value.place + ": '" + key + "'" + where + " must be " + wanted +
                                 ", for example " + example + ", but is " + describe(value)));
}

}  // namespace foreglow
