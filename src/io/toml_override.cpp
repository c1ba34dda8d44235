// SPDX-License-Identifier: GPL-2.0-or-later
#include <algorithm>
#include <optional>
#include <span>

#include "base/error.h"
#include "base/text.h"
#include "io/text_file.h"
#include "io/toml_document.h"

namespace foreglow {
namespace {

using Words = std::span<const std::string>;

std::string join(Words words) {
    std::string text;
    for (const std::string& word : words)
        text += (text.empty() ? "" : ".") + word;
    return text;
}

void mark_as_typed(TomlValue& value, const std::string& place, const std::string& typed) {
    value.place = value.key_place = place;
    value.from_command_line = true;
    value.as_typed = typed;
    for (TomlValue& item : value.items)
        mark_as_typed(item, place, "");
}

TomlValue make_value(const std::string& typed, const std::string& place) {
    TomlValue value;
    value.type = TomlValue::Type::String;
    value.text = typed;
    try {
        const TomlValue document = parse_toml("value = " + typed, place);
        // A line end in the text could smuggle further keys in; such a text is a string.
        if (document.keys.size() == 1) value = document.items.front();
    } catch (const InputError&) {
        // Not TOML: what was typed is the string itself, so that --set unit=uK_CMB needs no quotes inside
        // quotes.
    }
    mark_as_typed(value, place, typed);
    return value;
}

struct Element {
    TomlValue* value = nullptr;
    std::size_t words = 0;  ///< how many words of the key named it
};

/// Finds an element of an array of tables by its name, which may hold dots, or by its number.
Element find_element(TomlValue& array, Words words) {
    for (std::size_t count = words.size(); count-- > 1;)
        for (TomlValue& item : array.items) {
            const TomlValue* name = find_value(item, "name");
            if (name != nullptr && to_lower(name->text) == to_lower(join(words.first(count))))
                return {&item, count};
        }
    const std::string& word = words.front();
    if (word.empty() || word.size() > 6 || word.find_first_not_of("0123456789") != std::string::npos)
        return {};
    const auto number = static_cast<std::size_t>(std::stoul(word));
    if (number >= array.items.size()) return {};
    return {&array.items[number], 1};
}

std::string list_of_elements(const TomlValue& array) {
    std::string list;
    for (std::size_t i = 0; i < std::min<std::size_t>(array.items.size(), 8); ++i) {
        const TomlValue* name = find_value(array.items[i], "name");
        list +=
            (i == 0 ? "" : ", ") + (name != nullptr && !name->text.empty() ? name->text : std::to_string(i));
    }
    return array.items.size() > 8 ? list + ", ..." : list;
}

TomlValue& step_into(TomlValue& table, const std::string& key, const std::string& place) {
    const auto found = std::find(table.keys.begin(), table.keys.end(), key);
    if (found != table.keys.end()) return table.items[static_cast<std::size_t>(found - table.keys.begin())];
    TomlValue made;
    mark_as_typed(made, place, "");
    table.keys.push_back(key);
    table.items.push_back(std::move(made));
    return table.items.back();
}

void set_value(TomlValue& document, Words words, const TomlValue& value, const std::string& place) {
    TomlValue* table = &document;
    const Words all = words;
    while (words.size() > 1) {
        const std::string key = words.front();
        table = &step_into(*table, key, place);
        words = words.subspan(1);
        if (table->type == TomlValue::Type::Array && words.size() > 1) {
            const Element element = find_element(*table, words);
            if (element.value == nullptr)
                throw InputError(to_one_line(place + ": no [[" + key + "]] has the name or number '" +
                                             words.front() + "': there are " + list_of_elements(*table)));
            table = element.value;
            words = words.subspan(element.words);
        }
        if (table->type != TomlValue::Type::Table)
            throw InputError(to_one_line(place + ": '" + join(all.first(all.size() - words.size())) +
                                         "' is " + describe(*table) + " and has no key '" + join(words) +
                                         "' in it"));
    }
    step_into(*table, words.front(), place) = value;
}

}  // namespace

void apply_override(TomlValue& document, const std::string& assignment) {
    const std::string place = "--set " + assignment;
    const auto equals = assignment.find('=');
    if (equals == std::string::npos)
        throw InputError(to_one_line(place + ": write it as key=value, for example --set nside=64"));
    std::vector<std::string> words;
    for (const std::string& word : split(trim(assignment.substr(0, equals)), '.'))
        words.emplace_back(trim(word));
    if (std::any_of(words.begin(), words.end(), [](const std::string& word) { return word.empty(); }))
        throw InputError(to_one_line(
            place + ": the key before '=' has an empty part: write it as nside=64 or channel.low.noise=..."));
    set_value(document, words, make_value(std::string(trim(assignment.substr(equals + 1))), place), place);
}

}  // namespace foreglow
