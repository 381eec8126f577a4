// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/made_panel.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <map>
#include <stdexcept>
#include <utility>

#include "band_edges.hpp"
#include "quantity_text.hpp"
#include "sensible_range.hpp"
#include "solve_formula.hpp"
#include "steelyard/likelihoods/chemistry.hpp"

namespace steelyard::likelihoods {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();

/// Analytes, then derived quantities, by number.
struct Kind {
    std::string id;
    std::string_view unit;
    bool is_derived = false;
    bool unit_may_be_omitted = false;
    double plausible_low = 0.0, plausible_high = 0.0;
    detail::SensibleRange sensible;
};

const std::vector<Kind>& kinds() {
    static const std::vector<Kind> all = [] {
        std::vector<Kind> list;
        for (const Analyte& one : analytes()) {
            list.push_back({std::string(one.id), one.unit, false, one.unit_may_be_omitted, one.plausible_low,
                            one.plausible_high, detail::sensible_range(one.id)});
        }
        for (const DerivedQuantity& one : derived_quantities()) {
            list.push_back({std::string(one.id), one.unit, true, one.unit == "1", one.plausible_low,
                            one.plausible_high, detail::sensible_range(one.id)});
        }
        return list;
    }();
    return all;
}

const Kind& kind(int quantity) {
    return kinds()[static_cast<std::size_t>(quantity)];
}

/// The number of a quantity; -1 for what is none.
int number_of(std::string_view id) {
    static const std::map<std::string_view, int> numbers = [] {
        std::map<std::string_view, int> map;
        for (std::size_t i = 0; i < kinds().size(); ++i) {
            map.emplace(kinds()[i].id, static_cast<int>(i));
        }
        return map;
    }();
    const auto found = numbers.find(id);
    return found == numbers.end() ? -1 : found->second;
}

/// A solution with the numbers of its quantities.
struct NumberedSolution {
    const detail::Solution* solution = nullptr;
    int free = -1;
    std::vector<int> others;
};

const std::vector<NumberedSolution>& solutions_for(int quantity) {
    static const std::vector<std::vector<NumberedSolution>> all = [] {
        std::vector<std::vector<NumberedSolution>> list(kinds().size());
        for (const detail::Solution& solution : detail::solutions()) {
            NumberedSolution numbered{&solution, number_of(solution.free), {}};
            for (const std::string_view other : solution.others) {
                numbered.others.push_back(number_of(other));
            }
            list[static_cast<std::size_t>(number_of(solution.quantity))].push_back(std::move(numbered));
        }
        return list;
    }();
    return all[static_cast<std::size_t>(quantity)];
}

double power_of_ten(int exponent) {
    constexpr std::array<double, 10> powers = {1, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9};
    return powers[static_cast<std::size_t>(exponent)];
}

/// From where a value may be taken.
struct Stretch {
    double low = 0.0, high = 0.0;
    bool high_open = false;
    bool is_empty() const { return !(low < high || (low == high && !high_open)); }
};

Stretch overlap(const Stretch& a, const Stretch& b) {
    Stretch both{std::max(a.low, b.low), std::min(a.high, b.high), false};
    both.high_open = a.high < b.high   ? a.high_open
                     : b.high < a.high ? b.high_open
                                       : a.high_open || b.high_open;
    return both;
}

/// A number as it is printed: `units` times 10^-decimals, and the double that this text reads as.
struct Printed {
    double value = 0.0;
    int decimals = 0;
};

/// Uniform over the numbers of so many decimals inside a stretch, with more decimals where it holds none.
Printed pick(const Stretch& stretch, int decimals, double uniform) {
    for (int d = decimals; d <= decimals + 4 && d < 10; ++d) {
        const double scale = power_of_ten(d);
        // A millionth of the last place is no digit that is printed, and more than the tolerance of an edge.
        const double first = std::ceil(stretch.low * scale - 1e-6);
        const double last = stretch.high_open ? std::ceil(stretch.high * scale - 1e-6) - 1.0
                                              : std::floor(stretch.high * scale + 1e-6);
        if (first <= last) {
            const double units = std::min(last, first + std::floor(uniform * (last - first + 1.0)));
            return {units / scale, d};
        }
    }
    return {stretch.low, 9};
}

Stretch band_of(std::span<const double> edges, Eigen::Index band) {
    const auto b = static_cast<std::size_t>(band);
    return {b == 0 ? -infinity : edges[b - 1], b == edges.size() ? infinity : edges[b], b != edges.size()};
}

Stretch plausible(const Kind& one) {
    return {one.plausible_low, one.plausible_high, false};
}

/// The sensible part of a stretch; where it has none, the part next to its inner end, by a quarter of its
/// value.
Stretch sensible_part(const Stretch& stretch, const Kind& one) {
    const Stretch sensible = overlap(stretch, {one.sensible.low, one.sensible.high, false});
    if (!sensible.is_empty()) {
        return sensible;
    }
    Stretch near = overlap(stretch, plausible(one));
    const double step = 10.0 / power_of_ten(one.sensible.decimals);
    if (stretch.low > one.sensible.high) {
        near.high = std::min(near.high, near.low + std::max(step, 0.25 * std::abs(near.low)));
    } else {
        near.low = std::max(near.low, near.high - std::max(step, 0.25 * std::abs(near.high)));
    }
    return near;
}

bool is_in_band(double value, std::span<const double> edges, Eigen::Index band) {
    return std::isfinite(value) && detail::bands_of(Interval::point(value), edges).first == band;
}

/// Reads a panel of plain numbers the quick way; false when it must be read the general way.
bool read_quickly(const Panel& panel, PointReader& reader, BatchReading& reading) {
    PointPanel points = reader.empty_panel();
    points.sex = panel.sex;
    points.age = panel.age.value_or(not_known);
    for (const auto* entries : {&panel.measured, &panel.given}) {
        for (const auto& [id, entry] : *entries) {
            if (!entry.value.is_point()) {
                return false;
            }
            points.value[static_cast<std::size_t>(number_of(id))] = entry.value.low;
        }
    }
    for (const auto& [feature, seen] : panel.observed) {
        const int number = reader.feature_number(feature);
        points.level[static_cast<std::size_t>(number)] =
            static_cast<std::int16_t>(reader.level_number(number, seen.level));
    }
    return reader.read(points, reading);
}

/// A limit below which a value lies, as a case states it.
Reading below(double limit, const Kind& one) {
    Reading reading;
    reading.value = {one.plausible_low, limit, false, true, true, false};
    reading.as_read = fmt::format("<{}", limit);
    return reading;
}

}  // namespace

/// One case in the making.
class PanelMaker::Making {
  public:
    Making(const PanelMaker& maker, BandsToShow bands, std::span<const double> numbers, bool directly)
        : maker_(maker),
          set_(maker.set_),
          numbers_(numbers),
          directly_(directly),
          shown_(std::move(bands)),
          value_(kinds().size()),
          limit_(kinds().size(), std::numeric_limits<double>::quiet_NaN()) {}

    MadePanel run(std::string case_id) {
        make_person();
        for (const std::size_t table : maker_.order_) {
            if (shown_[table] == left_out) {
                continue;
            }
            if (!may_be_read(table)) {
                shown_[table] = left_out;
                continue;
            }
            show(table);
        }
        for (std::size_t t = 0; t < shown_.size(); ++t) {
            if (shown_[t] != left_out) {
                state_conditions(t);
            }
        }
        support_gate();
        return finish(std::move(case_id));
    }

  private:
    static constexpr std::size_t age_number = 0, sex_number = 1, first_quantity_number = 2;

    double number(int quantity) const {
        return numbers_[first_quantity_number + static_cast<std::size_t>(quantity)];
    }
    bool is_known(int quantity) const { return value_[static_cast<std::size_t>(quantity)].has_value(); }
    double known(int quantity) const { return value_[static_cast<std::size_t>(quantity)]->value; }
    void set(int quantity, const Printed& value) { value_[static_cast<std::size_t>(quantity)] = value; }
    bool is_read(int quantity) const { return maker_.read_by_table_[static_cast<std::size_t>(quantity)]; }
    Stretch bounds(int quantity) const {
        const Bounds& one = maker_.bounds_[static_cast<std::size_t>(quantity)];
        Stretch stretch{one.low, one.high, one.high_open};
        if (one.low_open) {
            stretch.low += 1.0 / power_of_ten(kind(quantity).sensible.decimals);
        }
        return overlap(stretch, plausible(kind(quantity)));
    }

    /// A value for what no table reads, inside its sensible range and what conditions ask for.
    Printed ordinary(int quantity) const {
        const Kind& one = kind(quantity);
        return pick(sensible_part(bounds(quantity), one), one.sensible.decimals, number(quantity));
    }

    void make_person() {
        const double least = std::ceil(std::max(18.0, set_.gate.age_least.value));
        person_.age = pick({least, std::max(88.0, least + 20.0), false}, 0, numbers_[age_number]).value;
        person_.female = numbers_[sex_number] < 0.5;
        person_.settings = &set_.gate.chemistry;
        // With sex, age and creatinine there is a filtration rate, which then would be read.
        static const int gfr = number_of("gfr");
        sex_is_stated_ = !is_read(gfr) || is_shown(gfr);
    }

    bool is_shown(int quantity) const {
        for (std::size_t t = 0; t < shown_.size(); ++t) {
            if (shown_[t] != left_out) {
                for (const Part& part : maker_.plans_[t].parts) {
                    if (part.quantity == quantity) {
                        return true;
                    }
                }
            }
        }
        return false;
    }

    /// Whether the conditions of use hold, as far as they are about what other tables read.
    bool may_be_read(std::size_t table) const {
        for (const Asked& asked : maker_.plans_[table].asked) {
            const Condition& condition = *asked.condition;
            if (!asked.is_shown) {
                continue;
            }
            if (asked.quantity < 0) {
                const auto level = levels_.find(condition.subject);
                if (level == levels_.end() ? condition.set_aside_when_unknown
                                           : level->second != condition.level) {
                    return false;
                }
            } else if (!is_known(asked.quantity)) {
                if (condition.set_aside_when_unknown) {
                    return false;
                }
            } else if (!holds(condition, known(asked.quantity))) {
                return false;
            }
        }
        return true;
    }

    static bool holds(const Condition& condition, double value) {
        return (!condition.at_least || detail::at_or_above(value, *condition.at_least)) &&
               (!condition.above || detail::strictly_above(value, *condition.above)) &&
               (!condition.at_most || !detail::strictly_above(value, *condition.at_most)) &&
               (!condition.below || !detail::at_or_above(value, *condition.below));
    }

    void show(std::size_t table) {
        const EvidenceTable& evidence = set_.tables[table];
        const Plan& plan = maker_.plans_[table];
        if (evidence.kind != FindingKind::joint) {
            show_part(plan.parts[0], shown_[table]);
            return;
        }
        const auto columns = static_cast<int>(evidence.joint_names[1].size());
        show_part(plan.parts[0], shown_[table] / columns);
        show_part(plan.parts[1], shown_[table] % columns);
    }

    void show_part(const Part& part, int band) {
        if (part.quantity < 0) {
            levels_[part.id] = part.levels[static_cast<std::size_t>(band)];
        } else if (kind(part.quantity).is_derived) {
            show_derived(part, band);
        } else {
            const Kind& one = kind(part.quantity);
            set(part.quantity,
                pick(wanted_stretch(part, band), one.sensible.decimals, number(part.quantity)));
        }
    }

    /// Where in its band a quantity is taken from: what the gate can live with, if the band holds any of
    /// that.
    Stretch wanted_stretch(const Part& part, int band) const {
        const Kind& one = kind(part.quantity);
        const Stretch whole = overlap(band_of(part.edges, band), plausible(one));
        const GateSettings& gate = set_.gate;
        static const int bicarbonate = number_of("serum_bicarbonate");
        static const int corrected = number_of("anion_gap_corrected");
        static const int gap = number_of("anion_gap");
        static const int gfr = number_of("gfr");
        Stretch wish = whole;
        if (part.quantity == bicarbonate) {
            wish = overlap(whole, {-infinity, gate.bicarbonate_low.value, true});
        } else if (part.quantity == corrected || part.quantity == gap) {
            // A high gap with a filtration rate that does not account for it is out of scope.
            const bool accounted_for =
                !is_known(gfr) || !detail::at_or_above(known(gfr), gate.gfr_reduced_below.value);
            constexpr double low_gap = 3.0;  // the gate's own: below it thinks of an error
            wish = overlap(whole, {low_gap, accounted_for ? infinity : gate.gap_high_from.value, false});
        }
        return sensible_part(wish.is_empty() ? whole : wish, one);
    }

    void show_derived(const Part& part, int band) {
        const Kind& one = kind(part.quantity);
        const Stretch stretch = wanted_stretch(part, band);
        const Printed wanted = pick(stretch, one.sensible.decimals, number(part.quantity));
        if (!directly_) {
            for (const NumberedSolution& way : solutions_for(part.quantity)) {
                if (solve(way, part, band, wanted.value)) {
                    return;
                }
            }
        }
        set(part.quantity, wanted);
        given_.push_back(part.quantity);
    }

    /// Tries to meet the band by one analyte; what it needs besides is made up only when it succeeds.
    bool solve(const NumberedSolution& way, const Part& part, int band, double wanted) {
        if (is_known(way.free) || is_read(way.free) || (way.solution->needs_person && !sex_is_stated_)) {
            return false;
        }
        std::array<Printed, 6> others{};
        std::array<double, 6> x{};
        for (std::size_t i = 0; i < way.others.size(); ++i) {
            const int other = way.others[i];
            if (!is_known(other) && is_read(other)) {
                return false;  // it was left out, and would be read
            }
            others[i] = is_known(other) ? *value_[static_cast<std::size_t>(other)] : made_up(other);
            x[i] = others[i].value;
        }
        if (would_show_another(way, part.quantity)) {
            return false;
        }
        const std::span<const double> inputs(x.data(), way.others.size());
        const double exact = way.solution->solve(wanted, inputs, person_);
        const Stretch allowed = bounds(way.free);
        const int decimals = kind(way.free).sensible.decimals;
        for (int d = decimals; d <= decimals + 3; ++d) {
            const double value = std::round(exact * power_of_ten(d)) / power_of_ten(d);
            if (!(value >= allowed.low &&
                  (allowed.high_open ? value < allowed.high : value <= allowed.high))) {
                continue;
            }
            const double result = way.solution->evaluate(value, inputs, person_);
            if (is_in_band(result, part.edges, band)) {
                for (std::size_t i = 0; i < way.others.size(); ++i) {
                    set(way.others[i], others[i]);
                }
                set(way.free, {value, d});
                set(part.quantity, {result, 0});  // for conditions and the gate; not written
                return true;
            }
        }
        return false;
    }

    /// Whether the analytes of a solution would, with those known, give a derived quantity that some table
    /// reads and this case is not to show.
    bool would_show_another(const NumberedSolution& way, int wanted) const {
        const auto will_be_known = [&](int quantity) {
            return is_known(quantity) || quantity == way.free ||
                   std::find(way.others.begin(), way.others.end(), quantity) != way.others.end();
        };
        for (const int other : maker_.derived_read_) {
            const auto& ways = solutions_for(other);
            if (other == wanted || ways.empty() || is_shown(other) ||
                (ways[0].solution->needs_person && !sex_is_stated_)) {
                continue;
            }
            if (will_be_known(ways[0].free) &&
                std::all_of(ways[0].others.begin(), ways[0].others.end(), will_be_known)) {
                return true;
            }
        }
        return false;
    }

    Printed made_up(int quantity) const {
        static const int glucose = number_of("urine_glucose");
        if (quantity == glucose) {
            const auto seen = levels_.find("glycosuria");
            if (seen != levels_.end() && seen->second == "present") {
                return pick({15, 90, false}, 0, number(quantity));
            }
        }
        return ordinary(quantity);
    }

    /// States what conditions of use ask about and no table reads, so that they can be checked and hold.
    void state_conditions(std::size_t table) {
        for (const Asked& asked : maker_.plans_[table].asked) {
            const Condition& condition = *asked.condition;
            if (asked.is_shown) {
                continue;
            }
            if (asked.quantity < 0) {
                levels_[condition.subject] = condition.level;
            } else if (!is_known(asked.quantity)) {
                set(asked.quantity, ordinary(asked.quantity));
                if (kind(asked.quantity).is_derived) {
                    given_.push_back(asked.quantity);
                }
            }
        }
    }

    // The gate wants an adult with a low bicarbonate, a gas that agrees, and a normal gap.
    void support_gate() {
        static const int bicarbonate = number_of("serum_bicarbonate");
        const double limit = set_.gate.bicarbonate_low.value;
        if (!is_known(bicarbonate)) {
            if (is_read(bicarbonate)) {
                state_limit(bicarbonate, limit);
            } else {
                const Kind& one = kind(bicarbonate);
                set(bicarbonate, pick(sensible_part(overlap(bounds(bicarbonate), {10, limit, true}), one),
                                      one.sensible.decimals, number(bicarbonate)));
            }
        }
        support_gas(bicarbonate);
        support_gap();
    }

    /// A left-out finding that the gate asks for is known to lie below a limit only, unless that too would be
    /// read.
    void state_limit(int quantity, double limit) {
        const Interval interval = below(limit, kind(quantity)).value;
        for (const Plan& plan : maker_.plans_) {
            for (const Part& part : plan.parts) {
                if (part.quantity == quantity && detail::bands_of(interval, part.edges).single()) {
                    return;
                }
            }
        }
        limit_[static_cast<std::size_t>(quantity)] = limit;
    }

    void support_gas(int bicarbonate) {
        static const int ph = number_of("arterial_ph");
        static const int pco2 = number_of("arterial_pco2");
        static const int from_gas = number_of("bicarbonate_from_gas");
        if (directly_ || !is_known(bicarbonate) || is_known(ph) || is_known(pco2) || is_read(ph) ||
            is_read(pco2) || is_read(from_gas)) {
            return;
        }
        const GateSettings& gate = set_.gate;
        const double expected = chemistry::expected_pco2(
            known(bicarbonate), gate.chemistry.expected_pco2_slope, gate.chemistry.expected_pco2_intercept);
        const double spread = 0.75 * gate.expected_pco2_band.value;
        const Printed pressure =
            pick(overlap({expected - spread, expected + spread, false}, plausible(kind(pco2))),
                 kind(pco2).sensible.decimals, number(pco2));
        const double exact = chemistry::ph_from_gas(known(bicarbonate), pressure.value);
        const double rounded = std::round(exact * 100.0) / 100.0;
        if (rounded >= kind(ph).plausible_low && rounded <= kind(ph).plausible_high) {
            set(pco2, pressure);
            set(ph, {rounded, 2});
        }
    }

    void support_gap() {
        static const int corrected = number_of("anion_gap_corrected");
        static const int gap = number_of("anion_gap");
        if (is_known(corrected) || (is_known(gap) && is_read(gap))) {
            return;
        }
        const double normal = set_.gate.gap_normal_to.value;
        if (is_read(corrected)) {
            state_limit(corrected, normal);
            return;
        }
        const Stretch stretch{std::min(6.0, normal), normal, false};
        const Printed wanted = pick(stretch, kind(corrected).sensible.decimals, number(corrected));
        const Part part{kind(corrected).id, corrected, {}, {}};
        if (!directly_ && !is_read(gap)) {
            for (const NumberedSolution& way : solutions_for(corrected)) {
                if (solve(way, part, 0, wanted.value)) {
                    return;
                }
            }
        }
        set(corrected, wanted);
        given_.push_back(corrected);
    }

    MadePanel finish(std::string case_id) {
        MadePanel made;
        made.shown = shown_;
        made.is_direct = directly_;
        Panel& panel = made.panel;
        panel.case_id = std::move(case_id);
        panel.age = person_.age;
        if (sex_is_stated_) {
            panel.sex = person_.female ? Sex::female : Sex::male;
        }
        for (int q = 0; q < static_cast<int>(value_.size()); ++q) {
            const Kind& one = kind(q);
            const double limit = limit_[static_cast<std::size_t>(q)];
            auto& entries = one.is_derived ? panel.given : panel.measured;
            if (!std::isnan(limit)) {
                entries.emplace(one.id, below(limit, one));
            } else if (is_known(q) &&
                       (!one.is_derived || std::find(given_.begin(), given_.end(), q) != given_.end())) {
                const Printed& value = *value_[static_cast<std::size_t>(q)];
                Reading reading;
                reading.value = Interval::point(value.value);
                reading.as_read = fmt::format("{:.{}f}", value.value, value.decimals);
                entries.emplace(one.id, std::move(reading));
            }
        }
        for (const auto& [feature, level] : levels_) {
            panel.observed.emplace(feature, Observation{level, {}});
        }
        return made;
    }

    const PanelMaker& maker_;
    const TableSet& set_;
    std::span<const double> numbers_;
    bool directly_;
    BandsToShow shown_;
    std::vector<std::optional<Printed>> value_;
    std::vector<double> limit_;  ///< where a value is known only to lie below it
    std::vector<int> given_;     ///< derived quantities stated themselves
    std::map<std::string, std::string, std::less<>> levels_;
    detail::Person person_;
    bool sex_is_stated_ = true;
};

PanelMaker::PanelMaker(const TableSet& set, std::vector<bool> drawn) : set_(set), drawn_(std::move(drawn)) {
    if (drawn_.size() != set_.tables.size()) {
        throw std::invalid_argument("one flag for each table is needed");
    }
    read_by_table_.assign(kinds().size(), false);
    std::vector<std::string> features;  // that some table reads
    for (const EvidenceTable& table : set_.tables) {
        Plan plan;
        if (table.kind == FindingKind::joint) {
            for (std::size_t m = 0; m < 2; ++m) {
                const bool is_feature = table.joint_edges[m].empty();
                plan.parts.push_back({table.joint_of[m], is_feature ? -1 : number_of(table.joint_of[m]),
                                      table.joint_edges[m],
                                      is_feature ? table.joint_names[m] : std::vector<std::string>{}});
            }
        } else {
            plan.parts.push_back({table.finding,
                                  table.kind == FindingKind::feature ? -1 : number_of(table.finding),
                                  table.edges, table.levels});
        }
        for (const Part& part : plan.parts) {
            if (part.quantity >= 0) {
                read_by_table_[static_cast<std::size_t>(part.quantity)] = true;
            } else {
                features.push_back(part.id);
            }
        }
        plans_.push_back(std::move(plan));
    }
    for (std::size_t q = 0; q < kinds().size(); ++q) {
        if (read_by_table_[q] && kinds()[q].is_derived) {
            derived_read_.push_back(static_cast<int>(q));
        }
    }
    for (std::size_t t = 0; t < plans_.size(); ++t) {
        for (const Condition& condition : set_.tables[t].usable_when) {
            const int quantity = condition.is_feature ? -1 : number_of(condition.subject);
            const bool shown =
                quantity >= 0
                    ? static_cast<bool>(read_by_table_[static_cast<std::size_t>(quantity)])
                    : std::find(features.begin(), features.end(), condition.subject) != features.end();
            plans_[t].asked.push_back({&condition, quantity, shown});
        }
    }
    settle_conditions();
    settle_order();
    check_bands();
    list_entries();
}

/// Narrows the bounds of a quantity to a condition; false, and nothing narrowed, when no value would be left.
bool PanelMaker::fits(const Asked& asked, std::vector<Bounds>& bounds) {
    const Condition& condition = *asked.condition;
    Bounds narrowed = bounds[static_cast<std::size_t>(asked.quantity)];
    const auto raise = [&](double limit, bool open) {
        if (limit > narrowed.low || (limit == narrowed.low && open)) {
            narrowed.low = limit;
            narrowed.low_open = open;
        }
    };
    const auto lower = [&](double limit, bool open) {
        if (limit < narrowed.high || (limit == narrowed.high && open)) {
            narrowed.high = limit;
            narrowed.high_open = open;
        }
    };
    if (condition.at_least) {
        raise(*condition.at_least, false);
    }
    if (condition.above) {
        raise(*condition.above, true);
    }
    if (condition.at_most) {
        lower(*condition.at_most, false);
    }
    if (condition.below) {
        lower(*condition.below, true);
    }
    const Kind& one = kind(asked.quantity);
    const double step = 1.0 / power_of_ten(one.sensible.decimals);
    if (std::max(narrowed.low, one.plausible_low) + step > std::min(narrowed.high, one.plausible_high)) {
        return false;
    }
    bounds[static_cast<std::size_t>(asked.quantity)] = narrowed;
    return true;
}

/// Conditions about what no table reads are met in every case, as far as they can be met together; of two
/// that contradict each other the first table's is.
void PanelMaker::settle_conditions() {
    bounds_.assign(kinds().size(), {-infinity, infinity});
    for (std::size_t t = 0; t < plans_.size(); ++t) {
        if (!drawn_[t]) {
            continue;
        }
        std::vector<Bounds> bounds = bounds_;
        auto levels = required_levels_;
        const bool possible =
            std::all_of(plans_[t].asked.begin(), plans_[t].asked.end(), [&](const Asked& asked) {
                if (asked.is_shown) {
                    return true;
                }
                if (asked.quantity >= 0) {
                    return fits(asked, bounds);
                }
                const auto [level, is_new] = levels.emplace(asked.condition->subject, asked.condition->level);
                return is_new || level->second == asked.condition->level;
            });
        if (possible) {
            bounds_ = std::move(bounds);
            required_levels_ = std::move(levels);
        } else {
            drawn_[t] = false;
            never_shown_.push_back(set_.tables[t].finding);
        }
    }
}

/// Features and analytes first, then what is derived from them; what a condition of use or the gate asks
/// about before what it is asked for.
void PanelMaker::settle_order() {
    const std::size_t count = plans_.size();
    const auto rank = [&](std::size_t t) {
        const bool derived = std::any_of(
            plans_[t].parts.begin(), plans_[t].parts.end(),
            [](const Part& part) { return part.quantity >= 0 && kind(part.quantity).is_derived; });
        const bool gap =
            plans_[t].parts[0].id == "anion_gap_corrected" || plans_[t].parts[0].id == "anion_gap";
        // What an alternative is made of may give the preferred one too, so it takes what the others leave.
        const bool second_choice =
            std::any_of(set_.one_of.begin(), set_.one_of.end(), [&](const OneOf& one_of) {
                const auto place =
                    std::find(one_of.findings.begin(), one_of.findings.end(), set_.tables[t].finding);
                return place != one_of.findings.end() && place != one_of.findings.begin();
            });
        return gap ? 3 : derived && second_choice ? 2 : derived ? 1 : 0;
    };
    const auto waits_for = [&](std::size_t t, std::size_t other) {
        return std::any_of(plans_[t].asked.begin(), plans_[t].asked.end(), [&](const Asked& asked) {
            return std::any_of(plans_[other].parts.begin(), plans_[other].parts.end(),
                               [&](const Part& part) { return part.id == asked.condition->subject; });
        });
    };
    std::vector<bool> settled(count);
    for (std::size_t t = 0; t < count; ++t) {
        settled[t] = !drawn_[t];
    }
    while (true) {
        std::optional<std::size_t> next;
        for (std::size_t t = 0; t < count; ++t) {
            bool waits = settled[t];
            for (std::size_t other = 0; other < count && !waits; ++other) {
                waits = !settled[other] && waits_for(t, other);
            }
            if (!waits && (!next || rank(t) < rank(*next))) {
                next = t;
            }
        }
        if (!next) {
            break;
        }
        order_.push_back(*next);
        settled[*next] = true;
    }
    for (std::size_t t = 0; t < count; ++t) {
        if (!settled[t]) {  // its conditions lead back to itself
            drawn_[t] = false;
            never_shown_.push_back(set_.tables[t].finding);
        }
    }
}

void PanelMaker::check_bands() const {
    for (std::size_t t = 0; t < plans_.size(); ++t) {
        for (const Part& part : plans_[t].parts) {
            if (!drawn_[t] || part.quantity < 0) {
                continue;
            }
            for (std::size_t band = 0; band <= part.edges.size(); ++band) {
                const Stretch stretch = overlap(band_of(part.edges, static_cast<Eigen::Index>(band)),
                                                plausible(kind(part.quantity)));
                if (stretch.is_empty()) {
                    throw std::invalid_argument(fmt::format(
                        "{}: band {} lies outside of what a case may state ({} to {})", part.id, band + 1,
                        kind(part.quantity).plausible_low, kind(part.quantity).plausible_high));
                }
            }
        }
    }
}

void PanelMaker::list_entries() {
    std::vector<bool> used(kinds().size(), false);
    std::vector<std::string> features;
    const auto use = [&](int quantity) { used[static_cast<std::size_t>(quantity)] = true; };
    const auto use_solutions = [&](int quantity) {
        use(quantity);
        for (const NumberedSolution& way : solutions_for(quantity)) {
            use(way.free);
            std::for_each(way.others.begin(), way.others.end(), use);
        }
    };
    for (std::size_t t = 0; t < plans_.size(); ++t) {
        if (!drawn_[t]) {
            continue;
        }
        for (const Part& part : plans_[t].parts) {
            part.quantity >= 0 ? use_solutions(part.quantity) : features.push_back(part.id);
        }
        for (const Asked& asked : plans_[t].asked) {
            if (asked.quantity >= 0 && !asked.is_shown) {
                use(asked.quantity);
            } else if (!asked.is_shown && std::find(features.begin(), features.end(),
                                                    asked.condition->subject) == features.end()) {
                features.push_back(asked.condition->subject);
            }
        }
    }
    for (const std::string_view id : {"serum_bicarbonate", "arterial_ph", "arterial_pco2"}) {
        use(number_of(id));
    }
    use_solutions(number_of("anion_gap_corrected"));
    for (std::size_t q = 0; q < kinds().size(); ++q) {
        if (used[q]) {
            entries_.push_back(
                {kinds()[q].id, kinds()[q].unit_may_be_omitted ? std::string_view{} : kinds()[q].unit});
        }
    }
    for (const std::string& feature : features) {
        entries_.push_back({feature, {}});
    }
}

std::size_t PanelMaker::numbers() const noexcept {
    return 2 + kinds().size();
}

bool PanelMaker::shows(MadePanel& made, PointReader* reader) const {
    const auto state_wanted = [&](std::size_t t) {
        return static_cast<unsigned char>(first_band_state + static_cast<unsigned>(made.shown[t]));
    };
    const auto agrees = [&](const PatternCode& code) {
        for (std::size_t t = 0; t < code.size(); ++t) {
            const auto state = static_cast<unsigned char>(code[t]);
            if (made.shown[t] == left_out ? state >= first_band_state : state != state_wanted(t)) {
                return false;
            }
        }
        return true;
    };
    BatchReading reading;
    if (reader != nullptr && read_quickly(made.panel, *reader, reading)) {
        made.gate = reading.gate;
        return agrees(reading.code);
    }
    const Quantities quantities = derive(made.panel, set_.gate.chemistry);
    made.gate = gate(made.panel, quantities, set_.gate).status;
    return agrees(code_of(set_, read_pattern(set_, made.panel, quantities)));
}

MadePanel PanelMaker::make(std::string case_id, const BandsToShow& bands, std::span<const double> numbers,
                           PointReader* reader) const {
    if (bands.size() != plans_.size() || numbers.size() != this->numbers()) {
        throw std::invalid_argument("a band for each table and all numbers of a case are needed");
    }
    BandsToShow wanted = bands;
    for (std::size_t t = 0; t < wanted.size(); ++t) {
        if (wanted[t] < left_out || wanted[t] >= set_.tables[t].bands()) {
            throw std::invalid_argument(fmt::format("{} has no band {}", set_.tables[t].finding, wanted[t]));
        }
        if (!drawn_[t]) {
            wanted[t] = left_out;
        }
    }
    for (const bool directly : {false, true}) {
        MadePanel made = Making(*this, wanted, numbers, directly).run(case_id);
        if (shows(made, reader)) {
            return made;
        }
    }
    throw std::logic_error(fmt::format("no panel was found that shows the bands of {}", case_id));
}

}  // namespace steelyard::likelihoods
