// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/pattern.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <set>

#include "arrange.hpp"
#include "band_edges.hpp"
#include "check_condition.hpp"
#include "wording.hpp"

namespace steelyard::likelihoods {
namespace {

using detail::bands_of;
using detail::BandSpan;
using detail::in_sentence;

/// What is known of one member of a joint table.
struct Member {
    bool known = false;
    Eigen::Index band = 0;
    std::string why_not;  ///< when not known
    bool given = false;   ///< there is a value, known or spanning bands
    std::string shown;    ///< `urine pH below 5.5`
};

class PatternReader {
  public:
    PatternReader(const TableSet& set, const Panel& panel, const Quantities& quantities)
        : set_(set), panel_(panel), quantities_(quantities) {}

    Pattern run() {
        for (std::size_t i = 0; i < set_.tables.size(); ++i) {
            pattern_.findings.push_back(read(i));
        }
        detail::arrange(set_, pattern_.findings);
        list_unread();
        return std::move(pattern_);
    }

  private:
    FindingReading read(std::size_t index) {
        const EvidenceTable& table = set_.tables[index];
        FindingReading reading;
        reading.table = index;
        switch (table.kind) {
            case FindingKind::quantity:
                locate_quantity(table, reading);
                break;
            case FindingKind::feature:
                locate_feature(table, reading);
                break;
            case FindingKind::joint:
                locate_joint(table, reading);
                break;
        }
        const detail::Applicability applicability =
            detail::check_conditions(set_, table.usable_when, panel_, quantities_);
        if (reading.use == Use::missing) {
            // Asking for it would be in vain as long as the case stands as it does.
            reading.barred = applicability.usable ? "" : applicability.why_not;
            return reading;
        }
        if (!applicability.usable) {
            reading.use = Use::set_aside;
            reading.why_not = applicability.why_not;
        }
        reading.remarks.insert(reading.remarks.end(), applicability.remarks.begin(),
                               applicability.remarks.end());
        reading.unchecked = applicability.unchecked;
        return reading;
    }

    /// `needs urine sodium and urine chloride`, or `not given` for what is measured and was not.
    std::string what_is_lacking(std::string_view id) const {
        const auto lacking = quantities_.lacking.find(id);
        if (lacking == quantities_.lacking.end() || lacking->second.empty()) {
            return "not given";
        }
        std::vector<std::string> words;
        for (const std::string& item : lacking->second) {
            const QuantityKind* kind = find_quantity(item);
            if (kind == nullptr) {
                return item;  // a reason in words, not the name of an input
            }
            words.push_back(in_sentence(kind->title));
        }
        return fmt::format("needs {}", detail::listed_in_words(words));
    }

    void remark_on_quantity(std::string_view id, const QuantityValue& quantity, std::span<const double> edges,
                            FindingReading& reading) const {
        reading.remarks.insert(reading.remarks.end(), quantity.remarks.begin(), quantity.remarks.end());
        // Strips are graded in steps of half a unit (common practice), so nearer than that to an edge the
        // band is open.
        constexpr double dipstick_step = 0.5;
        if (id != "urine_ph" || panel_.urine_ph_method != "dipstick" || !quantity.value.is_point()) {
            return;
        }
        for (const double edge : edges) {
            // Beside the step itself, 6.0 against 5.5, a strip does tell the two apart.
            if (std::abs(quantity.value.low - edge) < dipstick_step - detail::edge_tolerance(edge)) {
                reading.remarks.push_back(fmt::format(
                    "read by dipstick, and within {} of the band edge at {}: a pH electrode may put it in "
                    "another band",
                    detail::shown(dipstick_step), detail::shown(edge)));
                return;
            }
        }
    }

    void locate_quantity(const EvidenceTable& table, FindingReading& reading) const {
        const QuantityValue* quantity = quantities_.find(table.finding);
        if (quantity == nullptr) {
            reading.why_not = what_is_lacking(table.finding);
            return;
        }
        reading.value = quantity->value;
        remark_on_quantity(table.finding, *quantity, table.edges, reading);
        const BandSpan span = bands_of(quantity->value, table.edges);
        if (!span.single()) {
            reading.use = Use::set_aside;
            reading.why_not = spans(table.finding, *quantity, span);
            return;
        }
        reading.use = Use::read;
        reading.cells = {span.first};
        reading.band = table.band_names[static_cast<std::size_t>(span.first)];
    }

    std::string spans(std::string_view id, const QuantityValue& quantity, const BandSpan& span) const {
        return fmt::format("known only as {}, which spans {} bands", detail::known_as(panel_, id, quantity),
                           detail::count_in_words(span.count()));
    }

    void locate_feature(const EvidenceTable& table, FindingReading& reading) const {
        const auto seen = panel_.observed.find(table.finding);
        if (seen == panel_.observed.end()) {
            reading.why_not = "not given";
            return;
        }
        const auto level = std::find(table.levels.begin(), table.levels.end(), seen->second.level);
        reading.level = seen->second.level;
        if (level == table.levels.end()) {
            // A panel read with this set's vocabulary cannot get here; one built for another set can.
            reading.use = Use::set_aside;
            reading.why_not = fmt::format("\"{}\" is no level of this table", seen->second.level);
            return;
        }
        const auto band = level - table.levels.begin();
        reading.use = Use::read;
        reading.cells = {band};
        reading.band = table.band_names[static_cast<std::size_t>(band)];
    }

    Member locate_member(const EvidenceTable& table, std::size_t index, FindingReading& reading) const {
        const std::string& id = table.joint_of[index];
        const std::string title = in_sentence(set_.title_of(id));
        const std::vector<std::string>& names = table.joint_names[index];
        Member member;
        if (table.joint_edges[index].empty()) {
            const auto seen = panel_.observed.find(id);
            if (seen == panel_.observed.end()) {
                member.why_not = title + " not given";
                return member;
            }
            member.given = true;
            const auto level = std::find(names.begin(), names.end(), seen->second.level);
            member.known = level != names.end();
            member.band = level - names.begin();
            member.why_not =
                member.known ? ""
                             : fmt::format("{}: \"{}\" is no level of this table", title, seen->second.level);
        } else {
            const QuantityValue* quantity = quantities_.find(id);
            if (quantity == nullptr) {
                member.why_not = fmt::format("{} {}", title, what_is_lacking(id));
                return member;
            }
            member.given = true;
            remark_on_quantity(id, *quantity, table.joint_edges[index], reading);
            const BandSpan span = bands_of(quantity->value, table.joint_edges[index]);
            member.known = span.single();
            member.band = span.first;
            member.why_not = member.known ? "" : fmt::format("{} {}", title, spans(id, *quantity, span));
        }
        if (member.known) {
            member.shown = fmt::format("{} {}", title,
                                       detail::level_in_words(names[static_cast<std::size_t>(member.band)]));
        }
        return member;
    }

    /// With both members known one cell is read; with one, its margin; otherwise nothing.
    void locate_joint(const EvidenceTable& table, FindingReading& reading) const {
        const std::array<Member, 2> members = {locate_member(table, 0, reading),
                                               locate_member(table, 1, reading)};
        const auto columns = static_cast<Eigen::Index>(table.joint_names[1].size());
        const auto rows = static_cast<Eigen::Index>(table.joint_names[0].size());
        for (Eigen::Index r = 0; r < rows; ++r) {
            for (Eigen::Index c = 0; c < columns; ++c) {
                const bool fits = (!members[0].known || r == members[0].band) &&
                                  (!members[1].known || c == members[1].band);
                if (fits) {
                    reading.cells.push_back(r * columns + c);
                }
            }
        }
        if (!members[0].known && !members[1].known) {
            reading.cells.clear();
            reading.why_not = fmt::format("{}; {}", members[0].why_not, members[1].why_not);
            reading.use = members[0].given || members[1].given ? Use::set_aside : Use::missing;
            return;
        }
        reading.use = Use::read;
        for (const Member& member : members) {
            reading.band += reading.band.empty() ? "" : "; ";
            reading.band += member.known ? member.shown : "";
            if (!member.known) {
                reading.remarks.push_back(member.why_not + ", so the other finding is read alone");
            }
        }
        while (reading.band.ends_with("; ")) {
            reading.band.erase(reading.band.size() - 2);
        }
    }

    /// Marks a quantity or feature as looked at, with what it was computed from.
    void mark(std::set<std::string, std::less<>>& looked_at, std::string_view id) const {
        looked_at.emplace(id);
        if (const QuantityValue* quantity = quantities_.find(id)) {
            looked_at.insert(quantity->from.begin(), quantity->from.end());
        }
    }

    void list_unread() {
        std::set<std::string, std::less<>> looked_at;
        for (const EvidenceTable& table : set_.tables) {
            mark(looked_at, table.finding);
            for (const std::string& member : table.joint_of) {
                mark(looked_at, member);
            }
            for (const Condition& condition : table.usable_when) {
                mark(looked_at, condition.subject);
            }
        }
        for (const std::string& id : gate_inputs(set_.gate)) {
            mark(looked_at, id);
        }
        for (const UrgentLimit& limit : set_.urgent) {
            mark(looked_at, limit.quantity);
        }
        const auto list = [&](const auto& entries) {
            for (const auto& [id, entry] : entries) {
                if (!looked_at.contains(id)) {
                    pattern_.unread.push_back(id);
                }
            }
        };
        list(panel_.measured);
        list(panel_.given);
        list(panel_.observed);
    }

    const TableSet& set_;
    const Panel& panel_;
    const Quantities& quantities_;
    Pattern pattern_;
};

}  // namespace

Pattern read_pattern(const TableSet& set, const Panel& panel, const Quantities& quantities) {
    return PatternReader(set, panel, quantities).run();
}

Pattern reread(const TableSet& set, const Pattern& pattern, const std::vector<ReadingChange>& changes) {
    Pattern changed = pattern;
    detail::take_apart(changed.findings);
    for (const ReadingChange& change : changes) {
        FindingReading& reading = changed.findings.at(change.table);
        const EvidenceTable& table = set.tables.at(change.table);
        FindingReading other;
        other.table = change.table;
        if (change.cell) {
            other.use = Use::read;
            other.cells = {*change.cell};
            other.band = table.band_names.at(static_cast<std::size_t>(*change.cell));
        } else {
            other.why_not = "not given";
        }
        reading = std::move(other);
    }
    detail::arrange(set, changed.findings);
    return changed;
}

Eigen::ArrayXd log_probability(const Eigen::Ref<const Eigen::ArrayXd>& seen) {
    return seen.unaryExpr([](double p) { return std::log(std::min(p, 1.0)); });
}

Eigen::ArrayXXd log_likelihood_rows(const TableSet& set, const Pattern& pattern,
                                    const std::vector<std::string>& causes) {
    const auto read = std::count_if(pattern.findings.begin(), pattern.findings.end(),
                                    [](const FindingReading& reading) { return reading.use == Use::read; });
    Eigen::ArrayXXd rows(read, static_cast<Eigen::Index>(causes.size()));
    Eigen::Index line = 0;
    for (const FindingReading& reading : pattern.findings) {
        if (reading.use != Use::read) {
            continue;
        }
        const Eigen::ArrayXXd bands = band_probabilities(set, set.tables[reading.table], causes);
        Eigen::ArrayXd seen = Eigen::ArrayXd::Zero(rows.cols());
        for (const Eigen::Index cell : reading.cells) {
            seen += bands.row(cell).transpose();
        }
        rows.row(line++) = log_probability(seen).transpose();
    }
    return rows;
}

Eigen::ArrayXd row_weights(const Pattern& pattern) {
    std::vector<double> weights;
    for (const FindingReading& reading : pattern.findings) {
        if (reading.use == Use::read) {
            weights.push_back(reading.weight);
        }
    }
    return Eigen::Map<const Eigen::ArrayXd>(weights.data(), static_cast<Eigen::Index>(weights.size()));
}

}  // namespace steelyard::likelihoods
