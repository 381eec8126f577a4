// SPDX-License-Identifier: Apache-2.0
#pragma once
// What the parts of a text report share: the page they write on, the case they write about, the sources they
// name.

#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include "steelyard/cli/report.hpp"

namespace steelyard::cli {

/// The column of titles in tables of causes and findings.
inline constexpr std::size_t title_width = 47;

/// Sources cited so far, in order of first mention.
class Cited {
  public:
    void add(const document::Grounds& grounds, const document::Sources& sources);
    const std::vector<document::Source>& list() const noexcept { return list_; }

  private:
    std::vector<document::Source> list_;
};

/// Text in the making. Everything a file or a case supplied passes through here, so nothing of it reaches a
/// terminal unescaped.
class Page {
  public:
    explicit Page(bool colour) : colour_(colour) {}

    void line(std::string_view text = {});
    void heading(std::string_view text);
    void alarm(std::string_view text);
    void paragraph(std::string_view text, std::string_view first = "  ", std::string_view rest = "  ");
    void item(std::string_view text) { paragraph(text, "  - ", "    "); }

    Cited cited;
    std::string take() { return std::move(text_); }

  private:
    bool colour_;
    std::string text_;
};

/// What a part of the report is written from.
struct ReportView {
    const Weighing& weighing;
    const Sensitivity* sensitivity;  ///< null: nothing is said of how sure the answer is
    const likelihoods::TableSet& tables;
    Length length;

    bool full() const noexcept { return length == Length::full; }
    bool brief() const noexcept { return length == Length::brief; }
    const WeighedCause& cause(std::size_t index) const { return weighing.causes[index]; }
    const WeighedCause& ranked(std::size_t place) const { return weighing.causes[weighing.ranking[place]]; }
    /// The posterior of a cause as shown, rounded to what its interval supports.
    std::string posterior_shown(std::size_t index) const;
    /// The step of that rounding, in percentage points.
    int step_of(std::size_t index) const;
    /// The leader's posterior in another case: rounded as its own is; to whole percents in a full report,
    /// where one compares.
    std::string leader_would_have(const PerCause& posterior) const;
};

std::string with_unit(const std::string& number, std::string_view ucum);
/// `12 to 97 %`, `<1 to 5 %`.
std::string percent_range(double low, double high);
/// A share that the user gave, as it was typed: `10 %`, `99.5 %`.
std::string percent_as_typed(double share);
/// Two percentages, with as many figures as it takes to tell them apart.
std::pair<std::string, std::string> percents_apart(double a, double b);
/// A finding's title inside a sentence.
std::string in_sentence(const ReportView& view, const std::string& finding);
/// `at or above 3.5 mmol/L`: where a value would have to lie.
std::string beyond(const ReportView& view, const ValueEdge& edge);
std::string burden_of(const ReportView& view, const std::string& finding);
/// `not low` for the level `not_low`.
std::string band_shown(std::string name);
/// Titles of quantities, features or findings joined by `; `.
std::string listed_titles(const likelihoods::TableSet& tables, const std::vector<std::string>& ids);

// The parts, in the order of a report.
void write_fit_warning(const ReportView& view, Page& page);
void write_posterior(const ReportView& view, Page& page);
void write_overturning(const ReportView& view, Page& page);
void write_next(const ReportView& view, Page& page);
void write_ledger(const ReportView& view, Page& page);
void write_unread_findings(const ReportView& view, Page& page);
void write_all_sensitivity(const ReportView& view, Page& page);

}  // namespace steelyard::cli
