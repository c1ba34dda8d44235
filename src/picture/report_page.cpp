// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/report_page.h"

#include <algorithm>

#include "base/error.h"
#include "base/text.h"
#include "picture/markup.h"
#include "picture/report_style.h"

namespace foreglow {
namespace {

/// Escapes a sentence and sets what stands between backquotes as code; an unpaired backquote stays as it is.
std::string prose(const std::string& text) {
    const std::vector<std::string> pieces = split(text, '`');
    std::string out = escape_markup(pieces[0]);
    for (std::size_t i = 1; i < pieces.size(); ++i) {
        const bool is_code = i % 2 == 1 && i + 1 < pieces.size();
        const bool is_stray = i % 2 == 1 && i + 1 == pieces.size();
        if (is_code)
            out += "<code>" + escape_markup(pieces[i]) + "</code>";
        else
            out += join({is_stray ? "`" : "", escape_markup(pieces[i])});
    }
    return out;
}

/// Escapes the name of a file for a link: what a URL reserves becomes %XX, so that 'a#b.fits' is a file and
/// no anchor.
std::string link_target(const std::string& name) {
    constexpr std::string_view digits = "0123456789ABCDEF";
    std::string out;
    for (const char c : name) {
        const auto code = static_cast<unsigned char>(c);
        const bool plain = (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') ||
                           c == '-' || c == '_' || c == '.' || c == '/' || c == '~';
        if (plain)
            out += c;
        else
            out += {'%', digits[code >> 4U], digits[code & 15U]};
    }
    return out;
}

bool looks_like_number(const std::string& cell) {
    if (cell.empty() || cell == "-" || cell == "\u2013") return true;
    const std::string_view signs = cell.starts_with("\u2212") ? std::string_view(cell).substr(3) : cell;
    const std::size_t at = signs.find_first_not_of("+-<~ ");
    return at != std::string_view::npos && ((signs[at] >= '0' && signs[at] <= '9') || signs[at] == '.');
}

std::string heading(const std::string& text) {
    return join({"<h2>", text, "</h2>\n"});
}

std::string write_warnings(const std::vector<std::string>& warnings) {
    if (warnings.empty()) return "";
    std::string out =
        join({"<section class=\"warnings\">\n<h2>",
              warnings.size() == 1 ? "One thing to know first" : "Things to know first", "</h2>\n<ul>\n"});
    for (const std::string& warning : warnings)
        out += join({"<li>", prose(warning), "</li>\n"});
    return out + "</ul>\n</section>\n";
}

std::string write_facts(const std::string& title, const std::vector<ReportFact>& facts) {
    if (facts.empty()) return "";
    std::string out = join({"<section>\n", heading(title), "<dl>\n"});
    for (const ReportFact& fact : facts) {
        out += join({"<div><dt>", escape_markup(fact.label), "</dt><dd><span class=\"value\">",
                     prose(fact.value), "</span>"});
        if (!fact.note.empty()) out += join({"<span class=\"note\">", prose(fact.note), "</span>"});
        out += "</dd></div>\n";
    }
    return out + "</dl>\n</section>\n";
}

std::string write_figure(const ReportFigure& figure) {
    const std::string source = figure.png.empty()
                                   ? link_target(figure.file)
                                   : join({"data:image/png;base64,", encode_base64(figure.png)});
    std::string out =
        join({"<figure><img src=\"", source, "\" alt=\"", escape_markup(figure.alternative), "\""});
    if (figure.width > 0 && figure.height > 0)
        out += join(
            {" width=\"", std::to_string(figure.width), "\" height=\"", std::to_string(figure.height), "\""});
    out += "/>";
    if (!figure.caption.empty()) out += join({"<figcaption>", prose(figure.caption), "</figcaption>"});
    return out + "</figure>\n";
}

std::string write_figures(const std::vector<ReportFigure>& figures) {
    if (figures.empty()) return "";
    std::string out = join({"<section>\n", heading("Pictures"), "<div class=\"figures",
                            figures.size() % 2 == 1 ? " odd" : "", "\">\n"});
    for (const ReportFigure& figure : figures)
        out += write_figure(figure);
    return out + "</div>\n</section>\n";
}

std::string write_charts(const std::vector<ReportChart>& charts) {
    std::string out;
    for (std::size_t i = 0; i < charts.size(); ++i) {
        const ReportChart& one = charts[i];
        out += join({"<section>\n", heading(escape_markup(one.chart.title)), "<figure class=\"chart\">",
                     write_svg(one.chart, "chart-" + std::to_string(i + 1))});
        if (!one.caption.empty()) out += join({"<figcaption>", prose(one.caption), "</figcaption>"});
        out += "</figure>\n</section>\n";
    }
    return out;
}

std::string write_table(const ReportTable& table) {
    std::vector<bool> is_number(table.header.size(), true);
    for (const auto& row : table.rows) {
        FOREGLOW_EXPECTS(row.size() == table.header.size());
        for (std::size_t c = 0; c < row.size(); ++c)
            if (!looks_like_number(row[c])) is_number[c] = false;
    }
    const auto cell = [&](std::string_view tag, std::size_t column, const std::string& content) {
        const std::string_view scope = tag == "th" ? " scope=\"col\"" : "";
        return join(
            {"<", tag, scope, is_number[column] ? " class=\"number\">" : ">", content, "</", tag, ">"});
    };
    std::string out;
    if (!table.note.empty()) out += join({"<p class=\"note\">", prose(table.note), "</p>\n"});
    out += "<div class=\"scroll\" tabindex=\"0\" role=\"region\" aria-label=\"" + escape_markup(table.title) +
           "\"><table>\n<thead><tr>";
    for (std::size_t c = 0; c < table.header.size(); ++c)
        out += cell("th", c, prose(table.header[c]));
    out += "</tr></thead>\n<tbody>\n";
    for (const auto& row : table.rows) {
        out += "<tr>";
        for (std::size_t c = 0; c < row.size(); ++c)
            out += cell("td", c, prose(row[c]));
        out += "</tr>\n";
    }
    return out + "</tbody></table></div>\n";
}

std::string write_tables(const std::vector<ReportTable>& tables) {
    std::string out;
    for (const ReportTable& table : tables)
        out += join({"<section>\n", heading(escape_markup(table.title)), write_table(table), "</section>\n"});
    return out;
}

std::string write_files(const ReportContent& content) {
    if (content.files.empty() && content.how_to_open.empty()) return "";
    std::string out = join({"<section>\n", heading("Files and how to open them")});
    for (const ReportHowTo& way : content.how_to_open)
        out += join(
            {"<p>", prose(way.purpose), "</p>\n<pre><code>", escape_markup(way.command), "</code></pre>\n"});
    if (!content.files.empty()) {
        out +=
            "<div class=\"scroll\" tabindex=\"0\" role=\"region\" "
            "aria-label=\"Files\"><table>\n<thead><tr><th "
            "scope=\"col\">File</th><th scope=\"col\">What it holds</th><th scope=\"col\" "
            "class=\"number\">Size</th></tr></thead>\n<tbody>\n";
        for (const ReportFile& file : content.files)
            out += join({"<tr><td><a href=\"", link_target(file.name), "\">", escape_markup(file.name),
                         "</a></td><td>", prose(file.what), "</td><td class=\"number\">",
                         file.bytes ? format_bytes(*file.bytes) : std::string(), "</td></tr>\n"});
        out += "</tbody></table></div>\n";
    }
    return out + "</section>\n";
}

std::string write_head(const std::string& title) {
    return join({"<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\"/>\n",
                 "<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\"/>\n<title>",
                 escape_markup(title), "</title>\n<style>", make_report_style(), "</style>\n</head>\n"});
}

}  // namespace

std::string write_report_page(const ReportContent& content) {
    std::string out = write_head(content.title);
    out +=
        join({"<body>\n<div class=\"band\"></div>\n<header>\n<h1>", escape_markup(content.title), "</h1>\n"});
    for (const std::string& subtitle : content.subtitles)
        out += join({"<p class=\"subtitle\">", prose(subtitle), "</p>\n"});
    out += "</header>\n<main>\n";
    out += write_warnings(content.warnings);
    out += write_facts("What was made", content.facts);
    out += write_facts("Conventions of the numbers", content.conventions);
    out += write_figures(content.figures);
    out += write_charts(content.charts);
    out += write_facts("Accuracy", content.accuracy);
    out += write_tables(content.tables);
    out += write_files(content);
    out += "</main>\n";
    if (!content.footer.empty()) out += join({"<footer>", prose(content.footer), "</footer>\n"});
    return out + "</body>\n</html>\n";
}

}  // namespace foreglow
