// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "picture/chart.h"

namespace foreglow {

/// One line of what is known: "Reference frequency", "408 MHz", "where amplitude and index hold".
struct ReportFact {
    std::string label, value;
    std::string note;  ///< convention, source or caution beside the value; may be empty
};

struct ReportTable {
    std::string title, note;
    std::vector<std::string> header;
    std::vector<std::vector<std::string>> rows;  ///< each as long as the header; numbers line up at the right
};

/// One picture: its PNG bytes, put into the page itself, or the name of a file relative to the page.
struct ReportFigure {
    std::string png;
    std::string file;           ///< used where png is empty
    std::string caption;        ///< quantity, unit and convention
    std::string alternative;    ///< what it shows, for those who do not see it
    int width = 0, height = 0;  ///< in pixels, so that the page does not jump while it loads; 0 where unknown
};

struct ReportChart {
    Chart chart;
    std::string caption;
};

struct ReportFile {
    std::string name;  ///< relative to the page; a link
    std::string what;  ///< "I, Q, U at 70 GHz, uK_CMB"
    std::optional<std::uint64_t> bytes;
};

/// One way of opening the files: what one wants, and the line to type.
struct ReportHowTo {
    std::string purpose, command;
};

/// What a report page says, in the order in which it stands there; parts left empty do not appear.
struct ReportContent {
    std::string title;
    std::vector<std::string> subtitles;  ///< "24 channels from 20 GHz to 350 GHz, nside 256, uK_CMB"
    std::vector<std::string> warnings;
    std::vector<ReportFact> facts;        ///< what was made
    std::vector<ReportFact> conventions;  ///< K_RJ or K_CMB, frame, COSMO or IAU, sign of the index
    std::vector<ReportFigure> figures;
    std::vector<ReportChart> charts;
    std::vector<ReportFact> accuracy;  ///< asked for and reached
    std::vector<ReportTable> tables;   ///< channels and the like
    std::vector<ReportFile> files;
    std::vector<ReportHowTo> how_to_open;
    std::string footer;  ///< program and version
};

/// Writes the page as one HTML document without scripts or anything from elsewhere: pictures as data URIs,
/// charts as SVG; light and dark as the reader's screen is, made for phones, screens and paper. All text is
/// escaped; text between `backquotes` in notes, warnings and captions is set as code.
[[nodiscard]] std::string write_report_page(const ReportContent& content);

}  // namespace foreglow
