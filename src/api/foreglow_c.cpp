// SPDX-License-Identifier: GPL-2.0-or-later
#include "api/foreglow_c.h"

#include <algorithm>
#include <cstring>

#include "api/foreglow.h"

namespace {

void put_message(const char* text, char* message, std::size_t size) {
    if (message == nullptr || size == 0) return;
    const std::size_t length = std::min(std::strlen(text), size - 1);
    std::memcpy(message, text, length);
    message[length] = '\0';
}

}  // namespace

const char* foreglow_version() {
    static const std::string text = foreglow::api::library_version();
    return text.c_str();
}

int foreglow_make(const char* study, const char* out, int replace, char* message, std::size_t message_size) {
    put_message("", message, message_size);
    try {
        if (study == nullptr) throw foreglow::InputError("no study file was named: pass the path of one");
        foreglow::api::RunOptions options;
        if (out != nullptr) options.out = out;
        options.replace = replace != 0;
        foreglow::api::make_maps(study, options);
        return 0;
    } catch (const foreglow::Error& error) {
        put_message(error.what(), message, message_size);
        return error.exit_status();
    } catch (const std::exception& error) {
        put_message(error.what(), message, message_size);
        return 1;
    } catch (...) {  // no exception may pass through C
        put_message("an unknown fault stopped the work", message, message_size);
        return 1;
    }
}

double foreglow_brightness_ratio(double frequency_hz, double reference_hz, double index, double curvature) {
    return foreglow::api::brightness_ratio(foreglow::Frequency::from_hz(frequency_hz),
                                           foreglow::Frequency::from_hz(reference_hz), index, curvature);
}
