// SPDX-License-Identifier: GPL-2.0-or-later
#include <algorithm>
#include <utility>

#include "base/error.h"
#include "base/text.h"
#include "io/text_file.h"
#include "model/study_file.h"

namespace foreglow {
namespace {

/// Collects a study's values, each with the option it came from as its place, and the text of the file that
/// says the same.
class OptionTable {
  public:
    explicit OptionTable(std::string place) { table_.place = table_.key_place = std::move(place); }

    void add_text(const std::string& key, const std::optional<std::string>& text) {
        if (!text) return;
        TomlValue value;
        value.type = TomlValue::Type::String;
        value.text = *text;
        add(key, value, to_toml_string(*text));
    }
    void add_integer(const std::string& key, const std::optional<std::int64_t>& number) {
        if (!number) return;
        TomlValue value;
        value.type = TomlValue::Type::Integer;
        value.integer = *number;
        value.number = static_cast<double>(*number);
        add(key, value, std::to_string(*number));
    }
    void add_number(const std::string& key, const std::optional<double>& number) {
        if (!number) return;
        TomlValue value;
        value.type = TomlValue::Type::Float;
        value.number = *number;
        add(key, value, format_exact(*number));
    }
    void add_boolean(const std::string& key, bool boolean) {
        TomlValue value;
        value.type = TomlValue::Type::Boolean;
        value.boolean = boolean;
        add(key, value, boolean ? "true" : "false");
    }
    void add_raw(const std::string& key, TomlValue value) {
        table_.keys.push_back(key);
        table_.items.push_back(std::move(value));
    }

    [[nodiscard]] const TomlValue& table() const { return table_; }
    [[nodiscard]] const std::string& text() const { return text_; }

  private:
    void add(const std::string& key, TomlValue value, const std::string& written) {
        std::string option = "--" + key;
        std::replace(option.begin(), option.end(), '_', '-');
        // What a channel is named after its frequency is no option; its frequency is.
        if (key == "name") option = table_.place;
        value.place = value.key_place = option == table_.place ? option : option + " " + written;
        value.from_command_line = true;
        value.as_typed = value.type == TomlValue::Type::String ? value.text : written;
        add_raw(key, std::move(value));
        text_ += key + " = " + written + "\n";
    }

    TomlValue table_;
    std::string text_;
};

/// Names a channel after its frequency, "70 GHz" giving 70GHz; a text that is no frequency is refused later,
/// with its key.
std::string name_of(const std::string& frequency) {
    std::string name = frequency;
    try {
        name = to_text(parse_frequency(frequency));
    } catch (const InputError&) {
        return "channel";
    }
    std::erase(name, ' ');
    return name;
}

OptionTable make_channel(const StudyOptions& options, const std::string& frequency) {
    OptionTable channel("--frequency " + to_toml_string(frequency));
    channel.add_text("name", name_of(frequency));
    channel.add_text("frequency", frequency);
    channel.add_text("bandwidth", options.bandwidth);
    channel.add_text("beam_fwhm", options.beam_fwhm);
    return channel;
}

void add_truth(OptionTable& top, const std::optional<std::string>& truth) {
    if (truth == "true" || truth == "false")
        top.add_boolean("truth", truth == "true");
    else
        top.add_text("truth", truth);
}

}  // namespace

StudySpec make_study_from_options(const StudyOptions& options) {
    OptionTable top("command line");
    top.add_text("title", options.title.value_or(options.model));
    if (!options.model.empty()) top.add_text("model", options.model);
    top.add_integer("nside", options.nside);
    top.add_text("stokes", options.stokes);
    top.add_text("unit", options.unit);
    top.add_text("precision", options.precision);
    top.add_text("frame", options.frame);
    top.add_text("ordering", options.ordering);
    top.add_text("polarization_convention", options.polarization_convention);
    top.add_text("monopole", options.monopole);
    top.add_text("coverage", options.coverage);
    top.add_integer("lmax", options.lmax);
    top.add_number("accuracy", options.accuracy);
    top.add_integer("seed", options.seed);
    top.add_integer("realizations", options.realizations);
    add_truth(top, options.truth);
    std::string source = top.text();
    TomlValue channels;
    channels.type = TomlValue::Type::Array;
    channels.place = channels.key_place = "--frequency";
    for (const std::string& frequency : options.frequencies) {
        const OptionTable channel = make_channel(options, frequency);
        source += "\n[[channel]]\n" + channel.text();
        channels.items.push_back(channel.table());
    }
    if (!options.frequencies.empty()) top.add_raw("channel", channels);
    TomlValue document = top.table();
    for (const std::string& assignment : options.overrides) {
        apply_override(document, assignment);
        source += to_one_line("# --set " + assignment) + "\n";
    }
    for (const auto& [key, option] : {std::pair("model", "--model disc-and-loops"),
                                      {"nside", "--nside 64"},
                                      {"channel", "--frequency \"70 GHz\""}})
        if (find_value(document, key) == nullptr &&
            (key != std::string("channel") || find_value(document, "channel_grid") == nullptr))
            throw InputError(std::string("without a study file the option ") + split(option, ' ').front() +
                             " is needed: add it, for example " + option);
    StudySpec study = make_study(document, {});
    study.source = source;
    return study;
}

}  // namespace foreglow
