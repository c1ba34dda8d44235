// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/electrons.h"

#include <array>
#include <cmath>

#include "base/error.h"
#include "base/text.h"
#include "jobs/at_source.h"
#include "physics/electron_spectrum.h"
#include "physics/spectral_law.h"
#include "physics/synchrotron_kernel.h"

namespace foreglow {
namespace {

std::string option_of(const std::string& key) {
    std::string option = "--" + key;
    for (char& c : option)
        if (c == '_') c = '-';
    return option;
}

template <class Parse>
auto parse_option(const char* key, const std::string& text, Parse parse) {
    try {
        return parse(text);
    } catch (const InputError& error) {
        throw InputError(option_of(key) + " " + error.what());
    }
}

ElectronLaw read_law(const ElectronsOptions& options) {
    ElectronRequest request = options.request;
    if (options.field) request.field_uG = parse_option("field", *options.field, parse_field_ug);
    if (options.break_energy)
        request.break_GeV = parse_option("break_energy", *options.break_energy, parse_energy_gev);
    if (options.cutoff_energy)
        request.cutoff_GeV = parse_option("cutoff_energy", *options.cutoff_energy, parse_energy_gev);
    if (options.age) request.age_Myr = parse_option("age", *options.age, parse_time_myr);
    const auto check_range = [](const char* key, const std::optional<double>& value, double low,
                                double high) {
        if (value && !(*value >= low && *value <= high))
            throw InputError(option_of(key) + " must be from " + format_number(low, 6) + " to " +
                             format_number(high, 6) + ", but is " + format_exact(*value));
    };
    check_range("break_step", request.break_step, 0, 5);
    check_range("redshift", request.redshift, 0, 20);
    return make_electron_law(request, [](const std::string& key, std::string message) {
        // The sentences name keys of a model file; here they are options.
        for (const auto& [from, to] :
             {std::pair("break_energy", "--break-energy"), std::pair("cutoff_energy", "--cutoff-energy"),
              std::pair("aging = ", "--aging ")})
            if (const std::size_t at = message.find(from); at != std::string::npos)
                message.replace(at, std::string_view(from).size(), to);
        throw InputError(option_of(key) + " " + message);
    });
}

double read_slope(const ElectronsOptions& options, const ElectronLaw& law, Frequency reference) {
    const int given = (options.slope ? 1 : 0) + (options.index ? 1 : 0) + (options.flux_index ? 1 : 0);
    if (given != 1)
        throw InputError(
            std::string(given == 0 ? "nothing says how steep the electrons are"
                                   : "--slope, --index and --flux-index say the same") +
            ": give one of --slope 2.5 (N ~ E^-slope), --index -2.75 (T ~ nu^index) or --flux-index "
            "-0.75 (S ~ nu^flux-index)");
    const SlopeLimits limits = slope_limits(law);
    if (options.slope) {
        if (!(*options.slope >= limits.low && *options.slope <= limits.high))
            throw InputError("--slope must be from " + format_number(limits.low, 4) + " to " +
                             format_number(limits.high, 4) + " in this law, but is " +
                             format_exact(*options.slope));
        return *options.slope;
    }
    const double index = options.index ? *options.index : *options.flux_index - 2;
    const IndexOfSlope map(law, reference);
    const IndexOfSlope::Slope slope = map.find(index);
    if (slope.is_clamped || !std::isfinite(index)) {
        const double shift = options.index ? 0 : 2;
        throw InputError(
            std::string(options.index ? "--index " : "--flux-index ") + format_exact(index + shift) +
            ": these electrons have from " + format_number(map.value(limits.high) + shift, 4) + " to " +
            format_number(map.value(limits.low) + shift, 4) + " at " + to_text(reference) +
            ", with slopes from " + format_number(limits.high, 4) + " to " + format_number(limits.low, 4));
    }
    return slope.value;
}

struct Column {
    const char* key;
    const char* head;  // of a table, which is narrower
    const char* unit;
};
constexpr std::array<Column, 9> columns{{{"frequency_Hz", "frequency", "Hz"},
                                         {"ratio", "ratio", "T/T_ref"},
                                         {"index", "index", "T~nu^"},
                                         {"curvature", "curvature", ""},
                                         {"flux_index", "flux_index", "S~nu^"},
                                         {"polarized_fraction", "P/I", ""},
                                         {"intrinsic_fraction", "intrinsic", "P/I"},
                                         {"energy_GeV", "energy", "GeV"},
                                         {"lifetime_Myr", "lifetime", "Myr"}}};
using Row = std::array<double, columns.size()>;

Row make_row(const ElectronLaw& law, double slope, Frequency frequency, Frequency reference) {
    const LocalSpectrum local = local_spectrum(law, slope, frequency);
    const double intrinsic = intrinsic_polarized_fraction(law, slope, frequency);
    const double energy =
        energy_radiating_at(Frequency::from_hz(frequency.hz() * (1 + law.redshift)), law.field_uG);
    return {frequency.hz(),
            std::exp(log_electron_ratio(law, slope, frequency, reference)),
            local.index,
            local.curvature,
            flux_index(local.index),
            law.geometry == FieldGeometry::Tangled ? 0 : intrinsic,
            intrinsic,
            energy,
            1 / (loss_rate(law) * energy)};
}

std::string pad(const std::string& text) {
    constexpr std::size_t width = 12;
    return (text.size() < width ? std::string(width - text.size(), ' ') : " ") + text;
}

std::string make_heading(const ElectronLaw& law, double slope, Frequency reference) {
    std::string text = "electrons N ~ E^-" + format_number(slope, 7) + " in " +
                       format_number(law.field_uG, 6) + " uG, " +
                       (law.geometry == FieldGeometry::Ordered ? "ordered" : "tangled");
    if (law.redshift > 0) text += ", observed at redshift " + format_number(law.redshift, 6);
    text +=
        "\nratio: T over that at " + to_text(reference) +
        "; index: d ln T/d ln nu (Rayleigh-Jeans T); curvature: half the second derivative; flux_index = "
        "index + 2;\nP/I: net, 0 in a tangled field; energy: of the electron whose critical frequency this "
        "is; lifetime: 1/(b E), dE/dt = -b E^2\n";
    std::string keys;
    std::string units;
    for (const Column& column : columns) {
        keys += pad(column.head);
        units += pad(column.unit);
    }
    return text + keys + "\n" + units + "\n";
}

std::string write_row(const Row& row, RowFormat format, bool is_first) {
    std::string text;
    if (format == RowFormat::Json) text = is_first ? "[\n{" : ",\n{";
    for (std::size_t c = 0; c < row.size(); ++c) {
        const bool good = std::isfinite(row[c]);
        if (format == RowFormat::Table) {
            text += pad(good ? format_number(row[c], 6) : "-");
            continue;
        }
        if (c > 0) text += format == RowFormat::Json ? ", " : ",";
        if (format == RowFormat::Json) text += std::string("\"") + columns[c].key + "\": ";
        text += good ? format_exact(row[c]) : format == RowFormat::Json ? "null" : "";
    }
    return text + (format == RowFormat::Json ? "}" : "\n");
}

}  // namespace

void run_electrons(const ElectronsOptions& options, const std::function<bool(std::string_view)>& write) {
    const ElectronLaw law = read_law(options);
    const Frequency reference = parse_option("reference", options.reference, parse_frequency);
    std::vector<Frequency> frequencies = read_at_frequencies(options.frequencies);
    if (frequencies.empty()) frequencies.push_back(reference);
    const double slope = read_slope(options, law, reference);
    std::string heading;
    if (options.format == RowFormat::Table) heading = make_heading(law, slope, reference);
    if (options.format == RowFormat::Csv)
        for (const Column& column : columns)
            heading += std::string(heading.empty() ? "" : ",") + column.key +
                       (&column == &columns.back() ? "\n" : "");
    if (!heading.empty() && !write(heading)) return;
    for (std::size_t i = 0; i < frequencies.size(); ++i)
        if (!write(write_row(make_row(law, slope, frequencies[i], reference), options.format, i == 0)))
            return;
    if (options.format == RowFormat::Json) write("\n]\n");
}

}  // namespace foreglow
