// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/toml_document.h"

#define TOML_HEADER_ONLY 1
#define TOML_ENABLE_FORMATTERS 0
#include <toml++/toml.h>

#include <algorithm>
#include <sstream>
#include <utility>

#include "base/error.h"
#include "base/text.h"
#include "io/text_file.h"

namespace foreglow {
namespace {

std::string to_place(const std::string& file_name, const toml::source_position& position) {
    // A document's root and implicit tables have no position of their own: the first character stands for
    // them.
    const auto line = std::max<std::uint32_t>(1, position.line);
    const auto column = std::max<std::uint32_t>(1, position.column);
    return file_name + ":" + std::to_string(line) + ":" + std::to_string(column);
}

/// Writes 3.0 as the file has it, so that nobody is told that 3 is no whole number.
std::string with_point(const std::string& number) {
    return number.find_first_not_of("-0123456789") == std::string::npos ? number + ".0" : number;
}

TomlValue to_value(const toml::node& node, const std::string& file_name);

void add_entries(TomlValue& value, const toml::table& table, const std::string& file_name) {
    struct Entry {
        const toml::key* key;
        const toml::node* node;
    };
    std::vector<Entry> entries;
    for (auto&& [key, node] : table)
        entries.push_back({&key, &node});
    std::stable_sort(entries.begin(), entries.end(), [](const Entry& a, const Entry& b) {
        const auto& p = a.key->source().begin;
        const auto& q = b.key->source().begin;
        return std::pair(p.line, p.column) < std::pair(q.line, q.column);
    });
    for (const Entry& entry : entries) {
        value.keys.emplace_back(entry.key->str());
        value.items.push_back(to_value(*entry.node, file_name));
        value.items.back().key_place = to_place(file_name, entry.key->source().begin);
    }
}

TomlValue to_value(const toml::node& node, const std::string& file_name) {
    using Type = TomlValue::Type;
    TomlValue value;
    value.place = to_place(file_name, node.source().begin);
    value.key_place = value.place;
    if (const auto* table = node.as_table()) {
        value.type = Type::Table;
        add_entries(value, *table, file_name);
    } else if (const auto* array = node.as_array()) {
        value.type = Type::Array;
        for (const toml::node& item : *array)
            value.items.push_back(to_value(item, file_name));
    } else if (const auto* text = node.as_string()) {
        value.type = Type::String;
        value.text = text->get();
    } else if (const auto* integer = node.as_integer()) {
        value.type = Type::Integer;
        value.integer = integer->get();
        value.number = static_cast<double>(value.integer);
    } else if (const auto* number = node.as_floating_point()) {
        value.type = Type::Float;
        value.number = number->get();
    } else if (const auto* boolean = node.as_boolean()) {
        value.type = Type::Boolean;
        value.boolean = boolean->get();
    } else {
        value.type = Type::Date;
    }
    return value;
}

}  // namespace

TomlValue parse_toml(std::string_view text, const std::string& file_name) {
    if (text.starts_with("SIMPLE  ="))
        throw InputError(to_one_line(file_name +
                                     ":1:1: this is a FITS file, not a study or model: name it as `map` in a "
                                     "model file (`foreglow start --model-for` prints one)"));
    try {
        return to_value(toml::parse(text), file_name);
    } catch (const toml::parse_error& error) {
        const std::string description(error.description());
        // What a string without its closing quote runs into is the end of its line.
        const bool is_open = description.find("control characters") != std::string::npos;
        throw InputError(to_one_line(to_place(file_name, error.source().begin) +
                                     ": this is not valid TOML: " + description +
                                     (is_open ? " (is a closing quote missing?)" : "")));
    }
}

const TomlValue* find_value(const TomlValue& table, std::string_view key) {
    const auto found = std::find(table.keys.begin(), table.keys.end(), key);
    if (found == table.keys.end()) return nullptr;
    return &table.items[static_cast<std::size_t>(found - table.keys.begin())];
}

std::string describe(const TomlValue& value) {
    switch (value.type) {
        case TomlValue::Type::String:
            return "the string '" + (value.text.size() > 80 ? value.text.substr(0, 77) + "..." : value.text) +
                   "'";
        case TomlValue::Type::Integer:
            return "the whole number " + std::to_string(value.integer);
        case TomlValue::Type::Float:
            return "the number " + with_point(format_exact(value.number));
        case TomlValue::Type::Boolean:
            return value.boolean ? "true" : "false";
        case TomlValue::Type::Date:
            return "a date or time";
        case TomlValue::Type::Array:
            return "an array";
        case TomlValue::Type::Table:
            return "a table";
    }
    return "";
}

std::string to_toml_string(std::string_view text) {
    constexpr std::string_view digits = "0123456789ABCDEF";
    std::string quoted = "\"";
    for (const char c : text) {
        const auto byte = static_cast<unsigned char>(c);
        if (byte < 0x20 || byte == 0x7f) {
            quoted += "\\u00";
            quoted += digits[byte >> 4U];
            quoted += digits[byte & 15U];
            continue;
        }
        if (c == '"' || c == '\\') quoted += '\\';
        quoted += c;
    }
    return quoted + "\"";
}

}  // namespace foreglow
