// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/value_scale.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <cstdint>
#include <limits>
#include <numbers>

#include "base/error.h"
#include "base/text.h"
#include "base/vector_width.h"

namespace foreglow {
namespace {

// Of these, 164 lie beyond a percentile of 0.5, which is therefore known to 8 % of itself.
constexpr std::size_t largest_sample = 32'768;

/// Returns log2 of a positive number to 1e-9 in a form that compilers turn into vector code: the exponent,
/// and twice artanh((m - 1)/(m + 1)) of the mantissa m between sqrt(1/2) and sqrt(2), whose series ends with
/// the 9th power.
FOREGLOW_INLINE double quick_log2(double value) {
    constexpr std::uint64_t mantissa = 0xFFFFFFFFFFFFFULL, one = 0x3FF0000000000000ULL;
    constexpr std::uint64_t two_to_52 = 0x4330000000000000ULL;
    const auto bits = std::bit_cast<std::uint64_t>(value);
    double exponent = std::bit_cast<double>((bits >> 52U) | two_to_52) - (4503599627370496.0 + 1023.0);
    double m = std::bit_cast<double>((bits & mantissa) | one);
    const bool is_high = m > std::numbers::sqrt2;
    m = is_high ? 0.5 * m : m;
    exponent = is_high ? exponent + 1 : exponent;
    const double t = (m - 1) / (m + 1), s = t * t;
    return exponent +
           2 * std::numbers::log2e * t * (1 + s * (1.0 / 3 + s * (1.0 / 5 + s * (1.0 / 7 + s / 9))));
}

FOREGLOW_WIDE void write_log10(const double* values, std::size_t count, double* out) {
    constexpr double log10_2 = std::numbers::ln2 / std::numbers::ln10;
    for (std::size_t i = 0; i < count; ++i) {
        const double v = values[i], log = log10_2 * quick_log2(v);
        const double shown = v <= 0 ? -std::numeric_limits<double>::infinity() : log;
        out[i] = v != v ? v : shown;
    }
}

FOREGLOW_WIDE void write_asinh(const double* values, std::size_t count, double per_knee, double* out) {
    for (std::size_t i = 0; i < count; ++i) {
        const double v = values[i], size = std::abs(v) * per_knee;
        const double bent = std::numbers::ln2 * quick_log2(size + std::sqrt(size * size + 1));
        const double shown = v < 0 ? -bent : bent;
        out[i] = v != v ? v : shown;
    }
}

double percentile(std::vector<double>& sample, double percent) {
    const auto last = static_cast<double>(sample.size() - 1);
    const auto rank = static_cast<std::ptrdiff_t>(std::lround(percent / 100 * last));
    std::nth_element(sample.begin(), sample.begin() + rank, sample.end());
    return sample[static_cast<std::size_t>(rank)];
}

/// Takes every n-th defined value that the filter lets through; all values where that leaves none.
template <typename Keep>
std::vector<double> make_sample(std::span<const double> values, const Keep& keep) {
    const std::size_t all = values.size();
    for (std::size_t step = (all + largest_sample - 1) / largest_sample;; step = 1) {
        std::vector<double> sample;
        for (std::size_t i = 0; i < all; i += step)
            if (std::isfinite(values[i]) && keep(values[i])) sample.push_back(values[i]);
        if (!sample.empty() || step <= 1) return sample;
    }
}

struct Range {
    double low, high;
};

Range widened(Range range) {
    const double margin = std::max(std::abs(range.low), std::abs(range.high)) * 0.05;
    if (margin == 0) return {-1, 1};
    return {range.low - margin, range.high + margin};
}

void check_request(const ScaleRequest& request) {
    if (request.low && request.high && !(*request.low < *request.high))
        throw InputError("the range " + format_number(*request.low, 6) + " to " +
                         format_number(*request.high, 6) + " is empty: give a low end below the high end");
    if (request.kind == ScaleKind::Log &&
        ((request.low && *request.low <= 0) || (request.high && *request.high <= 0)))
        throw InputError(
            "a log scale shows positive values only, and the range asked for is not positive: change the "
            "range, or choose the linear or signed scale");
}

Range open_range(std::span<const double> values, const ScaleRequest& request, ScaleKind kind) {
    const bool log = kind == ScaleKind::Log;
    std::vector<double> sample = make_sample(values, [log](double v) { return !log || v > 0; });
    Range range{log ? 1.0 : 0.0, 1.0};
    if (!sample.empty()) {
        range.low = percentile(sample, request.low_percentile);
        range.high = percentile(sample, request.high_percentile);
    }
    return {request.low.value_or(range.low), request.high.value_or(range.high)};
}

ScaleKind suitable_kind(std::span<const double> values, const ScaleRequest& request) {
    const Range range = open_range(values, request, ScaleKind::Linear);
    if (range.low < 0 && range.high > 0 &&
        std::min(-range.low, range.high) > 0.1 * std::max(-range.low, range.high))
        return ScaleKind::Signed;
    const bool positive =
        std::none_of(values.begin(), values.end(), [](double v) { return v <= 0; }) && range.low > 0;
    return positive && range.high > 8 * range.low ? ScaleKind::Log : ScaleKind::Linear;
}

void count_values(std::span<const double> values, ScaleChoice& choice) {
    choice.pixels = static_cast<std::int64_t>(values.size());
    for (const double v : values) {
        if (std::isnan(v))
            ++choice.undefined;
        else if (choice.scale.kind() == ScaleKind::Log && v <= 0)
            ++choice.not_positive;
        else if (v < choice.scale.low())
            ++choice.below;
        else if (v > choice.scale.high())
            ++choice.above;
    }
    if (choice.not_positive > 0)
        choice.notices.push_back(
            std::to_string(choice.not_positive) + (choice.not_positive == 1 ? " pixel is" : " pixels are") +
            " zero or negative, which a log scale cannot show: a flat colour named in the legend marks them");
}

ScaleKind settled_kind(std::span<const double> values, const ScaleRequest& request, ScaleChoice& choice) {
    const bool none = std::all_of(values.begin(), values.end(), [](double v) { return std::isnan(v); });
    if (none) {
        choice.notices.emplace_back(
            "no pixel of the map is defined, so the picture shows undefined sky only");
        return request.kind.value_or(ScaleKind::Linear);
    }
    const ScaleKind kind = request.kind ? *request.kind : suitable_kind(values, request);
    if (kind == ScaleKind::Log &&
        std::none_of(values.begin(), values.end(), [](double v) { return v > 0; })) {
        choice.notices.emplace_back("no pixel of the map is positive, so the scale is linear instead of log");
        return ScaleKind::Linear;
    }
    return kind;
}

ScaleChoice with_signed_scale(std::span<const double> values, Range range, ScaleChoice choice) {
    const double high = std::max(std::abs(range.low), std::abs(range.high));
    std::vector<double> sizes = make_sample(values, [](double v) { return v != 0; });
    for (double& v : sizes)
        v = std::abs(v);
    const double middle = sizes.empty() ? high : percentile(sizes, 50);
    choice.scale = ValueScale(ScaleKind::Signed, -high, high, std::clamp(middle, high / 1000, high));
    return choice;
}

}  // namespace

ScaleKind parse_scale(const std::string& text) {
    if (text == "linear") return ScaleKind::Linear;
    if (text == "log") return ScaleKind::Log;
    if (text == "signed") return ScaleKind::Signed;
    throw InputError("scale '" + text + "' is not known: write linear, log or signed");
}

ValueScale::ValueScale(ScaleKind kind, double low, double high, double knee)
    : kind_(kind), low_(low), high_(high), knee_(knee), bent_low_(0), bent_span_(1) {
    FOREGLOW_EXPECTS(low < high && (kind != ScaleKind::Log || low > 0) &&
                     (kind != ScaleKind::Signed || knee > 0));
    bent_low_ = bent(low);
    bent_span_ = bent(high) - bent_low_;
}

double ValueScale::bent(double value) const {
    switch (kind_) {
        case ScaleKind::Log:
            return value > 0 ? std::log10(value) : -std::numeric_limits<double>::infinity();
        case ScaleKind::Signed:
            return std::asinh(value / knee_);
        case ScaleKind::Linear:
            break;
    }
    return value;
}

double ValueScale::position(double value) const {
    return (bent(value) - bent_low_) / bent_span_;
}

void ValueScale::positions(std::span<const double> values, std::span<double> out) const {
    FOREGLOW_EXPECTS(out.size() == values.size());
    switch (kind_) {
        case ScaleKind::Linear:
            for (std::size_t i = 0; i < values.size(); ++i)
                out[i] = position(values[i]);
            break;
        case ScaleKind::Log:
            write_log10(values.data(), values.size(), out.data());
            break;
        case ScaleKind::Signed:
            write_asinh(values.data(), values.size(), 1 / knee_, out.data());
            break;
    }
    if (kind_ == ScaleKind::Linear) return;
    for (double& one : out)
        one = (one - bent_low_) / bent_span_;
}

ScaleChoice choose_scale(std::span<const double> values, const ScaleRequest& request) {
    check_request(request);
    ScaleChoice choice;
    const ScaleKind kind = settled_kind(values, request, choice);
    Range range = open_range(values, request, kind);
    if (range.low == range.high) {
        if (!request.low && !request.high)
            choice.notices.push_back("nearly all pixels of the map have the same value, " +
                                     format_number(range.low, 6) + ", so the range is set around it");
        range = widened(range);
    }
    if (!(range.low < range.high))
        throw InputError("the range asked for, " +
                         (request.low ? "from " + format_number(range.low, 6) + " up"
                                      : "up to " + format_number(range.high, 6)) +
                         ", leaves out nearly all values of the map: give both ends of the range");
    if (kind == ScaleKind::Signed)
        choice = with_signed_scale(values, range, std::move(choice));
    else
        choice.scale = ValueScale(kind, range.low, range.high);
    count_values(values, choice);
    return choice;
}

}  // namespace foreglow
