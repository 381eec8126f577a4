// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/tally.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <nlohmann/json.hpp>
#include <numeric>

#include "steelyard/cli/terminal.hpp"
#include "steelyard/cli/version.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::GateStatus;

// A cell's key in one number: code (31 bits), gate (1), cause, stratum and month (10 each).
constexpr unsigned word_bits = 10;
constexpr std::uint64_t word_mask = (1U << word_bits) - 1U;
constexpr std::size_t most_codes = std::size_t{1} << 31U;
static_assert(Tally::most_words < word_mask);

struct Key {
    std::uint64_t code = 0, gate = 0, cause = 0, stratum = 0, month = 0;

    std::uint64_t packed() const noexcept {
        std::uint64_t key = (code << 1U) | gate;
        key = (key << word_bits) | cause;
        key = (key << word_bits) | stratum;
        return (key << word_bits) | month;
    }
    static Key unpacked(std::uint64_t key) noexcept {
        Key result;
        result.month = key & word_mask;
        result.stratum = (key >> word_bits) & word_mask;
        result.cause = (key >> (2 * word_bits)) & word_mask;
        key >>= 3 * word_bits;
        result.gate = key & 1U;
        result.code = key >> 1U;
        return result;
    }
};

// Gate statuses in the order of their names.
constexpr std::uint64_t gate_number(GateStatus gate) noexcept {
    return gate == GateStatus::caution ? 0 : 1;
}
constexpr GateStatus gate_of(std::uint64_t number) noexcept {
    return number == 0 ? GateStatus::caution : GateStatus::in_scope;
}

bool is_month(std::string_view text) noexcept {
    const auto digit = [&](std::size_t i) { return text[i] >= '0' && text[i] <= '9'; };
    if (text.size() != 7 || text[4] != '-' || !digit(0) || !digit(1) || !digit(2) || !digit(3) || !digit(5) ||
        !digit(6)) {
        return false;
    }
    const int month = (text[5] - '0') * 10 + text[6] - '0';
    return month >= 1 && month <= 12;
}

bool is_utf8(std::string_view text) {
    try {
        return !nlohmann::json(text).dump().empty();
    } catch (const nlohmann::json::type_error&) {
        return false;
    }
}

/// The place of each word when all are sorted.
std::vector<std::uint64_t> ranks_of(const std::vector<std::string>& words) {
    std::vector<std::size_t> order(words.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) { return words[a] < words[b]; });
    std::vector<std::uint64_t> ranks(words.size());
    for (std::size_t place = 0; place < order.size(); ++place) {
        ranks[order[place]] = place;
    }
    return ranks;
}

std::string shown(const std::vector<std::string>& columns) {
    if (columns.empty()) {
        return "none";
    }
    std::string list;
    for (const std::string& column : columns) {
        list += (list.empty() ? "" : ", ") + visible(column);
    }
    return list;
}

/// What keeps two tallies apart, in words; empty when nothing does.
std::string difference(const TallyHead& a, const TallyHead& b) {
    if (a.reading_digest != b.reading_digest) {
        return fmt::format(
            "their patterns do not mean the same: the cases were read with other bands, conditions or gate "
            "limits (\"{}\" and \"{}\")",
            visible(a.tables_title), visible(b.tables_title));
    }
    if (a.tables_digest != b.tables_digest) {
        return fmt::format("they were read with different tables (\"{}\", {}, and \"{}\", {})",
                           visible(a.tables_title), a.tables_digest.substr(0, 23), visible(b.tables_title),
                           b.tables_digest.substr(0, 23));
    }
    if (a.by != b.by) {
        return fmt::format("they are kept by different columns ({} and {})", shown(a.by), shown(b.by));
    }
    if (a.months != b.months) {
        return "one keeps the months and the other does not";
    }
    if (a.least_cell != b.least_cell) {
        return fmt::format("cells below {} patients were dropped from one and below {} from the other",
                           a.least_cell, b.least_cell);
    }
    TallyHead rest = b;
    rest.versions = a.versions;
    return a == rest ? "" : "their heads contradict each other although their digests agree";
}

}  // namespace

TallyHead tally_head(const likelihoods::TableSet& tables, std::vector<std::string> by, bool months) {
    TallyHead head;
    head.versions = {std::string(version())};
    head.tables_title = tables.title;
    head.tables_digest = tables.digest;
    head.reading_digest = likelihoods::reading_digest(tables);
    for (const likelihoods::Cause& cause : tables.causes) {
        head.causes.push_back(cause.id);
    }
    for (const likelihoods::EvidenceTable& table : tables.tables) {
        head.findings.push_back({table.finding, likelihoods::states_of(table)});
    }
    head.by = std::move(by);
    head.months = months;
    return head;
}

std::optional<std::size_t> Tally::Words::find(std::string_view word) const {
    const auto found = numbers_.find(word);
    return found == numbers_.end() ? std::nullopt : std::optional(found->second);
}

std::size_t Tally::Words::append(std::string_view word) {
    numbers_.emplace(word, list_.size());
    list_.emplace_back(word);
    return list_.size() - 1;
}

std::size_t Tally::KeyHash::operator()(std::uint64_t key) const noexcept {
    // Keys of one pattern differ in few bits; the multiplication spreads them (Fibonacci hashing).
    key ^= key >> 32U;
    key *= 0x9e3779b97f4a7c15U;
    return static_cast<std::size_t>(key ^ (key >> 29U));
}

Tally::Tally(TallyHead head) : head_(std::move(head)) {
    // No final cause, stratum or month is word 0 of each; the causes of the tables come next.
    for (Words* words : {&causes_, &strata_, &months_}) {
        words->append("");
    }
    for (const std::string& cause : head_.causes) {
        causes_.append(cause);
    }
}

TallyFlow Tally::flow() const noexcept {
    TallyFlow flow;
    flow.diagnosed = diagnosed_;
    flow.outside = outside_;
    flow.undiagnosed = undiagnosed_;
    flow.weighed = diagnosed_ + outside_ + undiagnosed_;
    flow.out_of_scope = out_of_scope_total_;
    flow.set_aside = set_aside_;
    flow.read = flow.weighed + flow.out_of_scope + flow.set_aside;
    return flow;
}

std::size_t Tally::word(Words& words, std::string_view text, const char* what) {
    if (const std::optional<std::size_t> known = words.find(text)) {
        return *known;
    }
    if (words.list().size() > most_words) {
        throw TallyError(fmt::format(
            "more than {} different {}: a tally keeps few, so that a column of names or numbers is not kept "
            "by mistake",
            most_words, what));
    }
    if (text.size() > longest_word) {
        throw TallyError(fmt::format("one of the {} is longer than {} bytes", what, longest_word));
    }
    if (!is_utf8(text)) {
        throw TallyError(fmt::format("one of the {} is not UTF-8: {}", what, visible(text)));
    }
    return words.append(text);
}

std::size_t Tally::code_number(std::string_view code) {
    if (const std::optional<std::size_t> known = codes_.find(code)) {
        return *known;
    }
    bool fits = code.size() == head_.findings.size();
    for (std::size_t i = 0; fits && i < code.size(); ++i) {
        fits = static_cast<unsigned char>(code[i]) < head_.findings[i].states;
    }
    if (!fits) {
        throw std::invalid_argument("a pattern code that is not of the tables of this tally");
    }
    if (codes_.list().size() == most_codes) {
        throw TallyError("more different patterns than a tally can hold");
    }
    return codes_.append(code);
}

void Tally::count(std::uint64_t& total, std::uint64_t patients) {
    if (patients > most_patients - all_) {
        throw TallyError("more patients than a tally can count");
    }
    all_ += patients;
    total += patients;
}

void Tally::add(std::string_view code, GateStatus gate, std::string_view cause, std::string_view stratum,
                std::string_view month, std::uint64_t patients) {
    if (patients == 0) {
        return;
    }
    const std::size_t cause_number = word(causes_, cause, "final causes");
    if (gate == GateStatus::out_of_scope) {
        count(out_of_scope_total_, patients);
        const auto place = out_of_scope_.try_emplace(causes_.list()[cause_number], 0).first;
        place->second += patients;
        return;
    }
    if ((head_.by.empty() && !stratum.empty()) || (!month.empty() && (!head_.months || !is_month(month)))) {
        throw std::invalid_argument("a stratum or month that this tally does not keep");
    }
    Key key;
    key.code = code_number(code);
    key.gate = gate_number(gate);
    key.cause = cause_number;
    key.stratum = word(strata_, stratum, "strata");
    key.month = word(months_, month, "months");
    std::uint64_t& total = cause_number == 0                     ? undiagnosed_
                           : cause_number <= head_.causes.size() ? diagnosed_
                                                                 : outside_;
    count(total, patients);
    counts_[key.packed()] += patients;
}

void Tally::add_set_aside(std::uint64_t rows) {
    count(set_aside_, rows);
}

std::vector<int> Tally::states() const {
    std::vector<int> states;
    for (const TalliedFinding& finding : head_.findings) {
        states.push_back(finding.states);
    }
    return states;
}

void Tally::merge(const Tally& other) {
    if (&other == this) {
        merge(Tally(other));
        return;
    }
    if (const std::string why = difference(head_, other.head_); !why.empty()) {
        throw TallyError("these tallies cannot be added up: " + why);
    }
    std::vector<std::string> versions;
    std::set_union(head_.versions.begin(), head_.versions.end(), other.head_.versions.begin(),
                   other.head_.versions.end(), std::back_inserter(versions));
    head_.versions = std::move(versions);
    // Totals hold what was dropped as too small, so they are added for themselves.
    count(diagnosed_, other.diagnosed_);
    count(outside_, other.outside_);
    count(undiagnosed_, other.undiagnosed_);
    count(out_of_scope_total_, other.out_of_scope_total_);
    count(set_aside_, other.set_aside_);
    lost_.cells += other.lost_.cells;
    lost_.patients += other.lost_.patients;
    for (const auto& [cause, patients] : other.out_of_scope_) {
        out_of_scope_[cause] += patients;
    }
    const auto renumbered = [this](Words& words, const Words& others, const char* what) {
        std::vector<std::uint64_t> numbers;
        for (const std::string& text : others.list()) {
            numbers.push_back(word(words, text, what));
        }
        return numbers;
    };
    const std::vector<std::uint64_t> causes = renumbered(causes_, other.causes_, "final causes");
    const std::vector<std::uint64_t> strata = renumbered(strata_, other.strata_, "strata");
    const std::vector<std::uint64_t> months = renumbered(months_, other.months_, "months");
    std::vector<std::uint64_t> codes;
    codes.reserve(other.codes_.list().size());
    for (const std::string& code : other.codes_.list()) {
        codes.push_back(code_number(code));
    }
    for (const auto& [packed, patients] : other.counts_) {
        Key key = Key::unpacked(packed);
        key.code = codes[key.code];
        key.cause = causes[key.cause];
        key.stratum = strata[key.stratum];
        key.month = months[key.month];
        counts_[key.packed()] += patients;
    }
}

Tally Tally::suppressed(std::uint64_t least) const {
    Tally result(head_);
    result.head_.least_cell = std::max(head_.least_cell, least);
    result.lost_ = lost_;
    for_each([&](const TallyCell& cell) {
        if (cell.patients >= least) {
            result.add(cell.code, cell.gate, cell.cause, cell.stratum, cell.month, cell.patients);
        } else {
            ++result.lost_.cells;
            result.lost_.patients += cell.patients;
        }
    });
    for (const auto& [cause, patients] : out_of_scope_) {
        if (patients >= least) {
            result.out_of_scope_.emplace(cause, patients);
        }
    }
    result.all_ = all_;
    result.out_of_scope_total_ = out_of_scope_total_;
    result.set_aside_ = set_aside_;
    result.diagnosed_ = diagnosed_;
    result.outside_ = outside_;
    result.undiagnosed_ = undiagnosed_;
    return result;
}

void Tally::for_each(const std::function<void(const TallyCell&)>& visit) const {
    std::vector<std::string> characters;
    characters.reserve(codes_.list().size());
    const std::vector<int> of_findings = states();
    for (const std::string& code : codes_.list()) {
        characters.push_back(likelihoods::code_in_characters(of_findings, code));
    }
    const std::vector<std::uint64_t> codes = ranks_of(characters);
    characters = {};
    const std::vector<std::uint64_t> causes = ranks_of(causes_.list());
    const std::vector<std::uint64_t> strata = ranks_of(strata_.list());
    const std::vector<std::uint64_t> months = ranks_of(months_.list());

    struct Entry {
        std::uint64_t rank, packed, patients;
    };
    std::vector<Entry> entries;
    entries.reserve(counts_.size());
    for (const auto& [packed, patients] : counts_) {
        Key key = Key::unpacked(packed);
        key.code = codes[key.code];
        key.cause = causes[key.cause];
        key.stratum = strata[key.stratum];
        key.month = months[key.month];
        entries.push_back({key.packed(), packed, patients});
    }
    std::sort(entries.begin(), entries.end(), [](const Entry& a, const Entry& b) { return a.rank < b.rank; });
    for (const Entry& entry : entries) {
        const Key key = Key::unpacked(entry.packed);
        visit({codes_.list()[key.code], gate_of(key.gate), causes_.list()[key.cause],
               strata_.list()[key.stratum], months_.list()[key.month], entry.patients});
    }
}

}  // namespace steelyard::cli
