// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/ticks.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdio>

#include "base/text.h"

namespace foreglow {
namespace {

using LabelShare = std::function<double(const std::string&)>;

/// Builds 10^n times a small number from its decimal text, so that ticks are the doubles nearest to what they
/// say.
double decimal(double mantissa, int exponent) {
    std::array<char, 48> text{};
    std::snprintf(text.data(), text.size(), "%.0fe%d", mantissa, exponent);
    return std::strtod(text.data(), nullptr);
}

std::vector<Tick> make_list(const ValueScale& scale, std::vector<double> values) {
    std::sort(values.begin(), values.end());
    std::vector<Tick> ticks;
    for (const double v : values) {
        const double position = scale.position(v);
        constexpr double rounding = 1e-9;
        if (position < -rounding || position > 1 + rounding) continue;
        ticks.push_back({v, std::clamp(position, 0.0, 1.0), format_label(v)});
    }
    return ticks;
}

bool has_room(const std::vector<Tick>& ticks, const LabelShare& share) {
    for (std::size_t i = 1; i < ticks.size(); ++i)
        if (ticks[i].position - ticks[i - 1].position <
            (share(ticks[i].label) + share(ticks[i - 1].label)) / 2)
            return false;
    return true;
}

std::vector<Tick> linear_ticks(const ValueScale& scale, const LabelShare& share) {
    const double span = scale.high() - scale.low();
    const int smallest = static_cast<int>(std::floor(std::log10(span))) - 2;
    for (int exponent = smallest;; ++exponent)
        for (const double mantissa : {1.0, 2.0, 5.0}) {
            const double step = decimal(mantissa, exponent);
            if (step > 2 * span) return {};
            if (span / step > 60) continue;
            std::vector<double> values;
            for (double n = std::ceil(scale.low() / step - 1e-9); n <= scale.high() / step + 1e-9; ++n)
                values.push_back(decimal(n * mantissa, exponent) + 0.0);  // -0 becomes 0
            auto ticks = make_list(scale, std::move(values));
            if (has_room(ticks, share)) return ticks;
        }
}

std::vector<double> decades(int first, int last, int every, const std::vector<double>& mantissas) {
    std::vector<double> values;
    for (int e = first; e <= last; ++e)
        if (e % every == 0)
            for (const double m : mantissas)
                values.push_back(decimal(m, e));
    return values;
}

std::vector<Tick> log_ticks(const ValueScale& scale, const LabelShare& share) {
    const int first = static_cast<int>(std::floor(std::log10(scale.low())));
    const int last = static_cast<int>(std::ceil(std::log10(scale.high())));
    const std::vector<std::vector<double>> mantissas{
        {1, 1.5, 2, 3, 4, 5, 6, 7, 8, 9}, {1, 2, 3, 4, 5, 6, 8}, {1, 2, 3, 5}, {1, 2, 5}, {1, 3}, {1}};
    for (std::size_t choice = 1; choice < mantissas.size(); ++choice) {
        auto ticks = make_list(scale, decades(first, last, 1, mantissas[choice]));
        if (ticks.size() >= 2 && has_room(ticks, share)) return ticks;
    }
    for (int every = 2; every <= 64; ++every) {
        auto ticks = make_list(scale, decades(first, last, every, {1}));
        if (ticks.size() >= 2 && has_room(ticks, share)) return ticks;
    }
    return linear_ticks(scale, share);
}

/// Goes inwards from the ends, so that the decades that matter most keep their labels; zero always has one.
std::vector<Tick> signed_ticks(const ValueScale& scale, const LabelShare& share) {
    const int first = static_cast<int>(std::floor(std::log10(scale.knee()))) - 1;
    const int last = static_cast<int>(std::ceil(std::log10(scale.high())));
    std::vector<double> kept{0};
    for (const std::vector<double>& mantissas : {std::vector<double>{1}, {5, 2}})
        for (int e = last; e >= first; --e)
            for (const double m : mantissas) {
                std::vector<double> tried = kept;
                tried.push_back(decimal(m, e));
                tried.push_back(-decimal(m, e));
                if (has_room(make_list(scale, tried), share)) kept = std::move(tried);
            }
    return make_list(scale, kept);
}

std::string superscript(int number) {
    constexpr std::array<const char*, 10> digits{"\u2070", "\u00b9", "\u00b2", "\u00b3", "\u2074",
                                                 "\u2075", "\u2076", "\u2077", "\u2078", "\u2079"};
    std::string out;
    for (const char c : std::to_string(number))
        out += c == '-' ? "\u207b" : digits[static_cast<std::size_t>(c - '0')];
    return out;
}

std::string with_true_minus(const std::string& text) {
    std::string out(text);
    if (out.starts_with('-')) out.replace(0, 1, "\u2212");
    return out;
}

}  // namespace

std::string format_label(double value, int digits) {
    if (std::isnan(value)) return "undefined";
    const double size = std::abs(value);
    if (value == 0 || (size >= 1e-3 && size < 1e5)) return with_true_minus(format_number(value, digits));
    std::array<char, 48> buffer{};
    std::snprintf(buffer.data(), buffer.size(), "%.*e", digits - 1, value);
    const std::string text(buffer.data());
    const auto e = text.find('e');
    if (e == std::string::npos) return with_true_minus(text);
    const std::string mantissa = format_number(std::strtod(text.substr(0, e).c_str(), nullptr), digits);
    std::string power = "10" + superscript(std::atoi(text.c_str() + e + 1));
    if (mantissa == "1") return power;
    std::string out = with_true_minus(mantissa == "-1" ? "-" : mantissa + "\u00d7");
    out += power;
    return out;
}

std::vector<Tick> make_ticks(const ValueScale& scale, const LabelShare& label_share) {
    switch (scale.kind()) {
        case ScaleKind::Log:
            return log_ticks(scale, label_share);
        case ScaleKind::Signed:
            return signed_ticks(scale, label_share);
        case ScaleKind::Linear:
            break;
    }
    return linear_ticks(scale, label_share);
}

}  // namespace foreglow
