// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/markup.h"

#include <cstdint>

namespace foreglow {

std::string escape_markup(std::string_view text) {
    std::string out;
    out.reserve(text.size());
    for (const char c : text) {
        switch (c) {
            case '&':
                out += "&amp;";
                break;
            case '<':
                out += "&lt;";
                break;
            case '>':
                out += "&gt;";
                break;
            case '"':
                out += "&quot;";
                break;
            case '\'':
                out += "&#39;";
                break;
            default: {
                const auto code = static_cast<unsigned char>(c);
                const bool allowed = code >= 0x20 || c == '\n' || c == '\t' || c == '\r';
                if (allowed)
                    out += c;
                else
                    out += "\uFFFD";
            }
        }
    }
    return out;
}

std::string join(std::initializer_list<std::string_view> pieces) {
    std::string out;
    for (const std::string_view piece : pieces)
        out += piece;
    return out;
}

std::string encode_base64(std::string_view bytes) {
    constexpr std::string_view letters = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
    std::string out;
    out.reserve((bytes.size() + 2) / 3 * 4);
    for (std::size_t i = 0; i < bytes.size(); i += 3) {
        std::uint32_t word = 0;
        for (std::size_t k = 0; k < 3; ++k)
            word = (word << 8U) | (i + k < bytes.size() ? static_cast<unsigned char>(bytes[i + k]) : 0U);
        for (std::size_t k = 0; k < 4; ++k)
            out += k <= bytes.size() - i ? letters[(word >> (18U - 6U * k)) & 63U] : '=';
    }
    return out;
}

}  // namespace foreglow
