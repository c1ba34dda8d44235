// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/json_value.h"

#include <cmath>
#include <fstream>
#include <nlohmann/json.hpp>

#include "base/error.h"

namespace foreglow {
namespace {

using Json = nlohmann::ordered_json;

Json to_library(const JsonValue& value) {
    return std::visit(
        [](const auto& held) -> Json {
            using Held = std::decay_t<decltype(held)>;
            if constexpr (std::is_same_v<Held, std::monostate>) {
                return nullptr;
            } else if constexpr (std::is_same_v<Held, double>) {
                return std::isfinite(held) ? Json(held) : Json(nullptr);
            } else if constexpr (std::is_same_v<Held, JsonValue::Array>) {
                Json array = Json::array();
                for (const JsonValue& one : held)
                    array.push_back(to_library(one));
                return array;
            } else if constexpr (std::is_same_v<Held, JsonValue::Object>) {
                Json object = Json::object();
                for (const auto& [key, one] : held)
                    object[key] = to_library(one);
                return object;
            } else {
                return held;
            }
        },
        value.storage());
}

JsonValue from_library(const Json& json) {
    switch (json.type()) {
        case Json::value_t::boolean:
            return json.get<bool>();
        case Json::value_t::number_integer:
            return json.get<std::int64_t>();
        case Json::value_t::number_unsigned:
            return json.get<std::uint64_t>();
        case Json::value_t::number_float:
            return json.get<double>();
        case Json::value_t::string:
            return json.get<std::string>();
        case Json::value_t::array: {
            JsonValue::Array array;
            for (const Json& one : json)
                array.push_back(from_library(one));
            return array;
        }
        case Json::value_t::object: {
            JsonValue::Object object;
            for (const auto& [key, one] : json.items())
                object.emplace_back(key, from_library(one));
            return object;
        }
        default:
            return {};
    }
}

}  // namespace

const JsonValue* JsonValue::find(const std::string& key) const {
    if (const auto* object = std::get_if<Object>(&value_))
        for (const auto& [name, value] : *object)
            if (name == key) return &value;
    return nullptr;
}

std::string write_json(const JsonValue& value) {
    return to_library(value).dump(2, ' ', false, Json::error_handler_t::replace) + "\n";
}

JsonValue read_json(const std::filesystem::path& path) {
    std::ifstream file(path);
    if (!file || std::filesystem::is_directory(path)) throw FileError("cannot read " + path.string());
    constexpr int deepest = 64;  // our own files need 4; more would only fill the stack
    bool too_deep = false;
    const auto stop_when_deep = [&too_deep](int depth, Json::parse_event_t, const Json&) {
        too_deep = too_deep || depth > deepest;
        return !too_deep;
    };
    const Json json = Json::parse(file, stop_when_deep, false);
    if (too_deep || json.is_discarded()) throw DataError(path.string() + " is no JSON file");
    return from_library(json);
}

}  // namespace foreglow
