// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/point_reader.hpp"

#include <algorithm>
#include <array>
#include <bitset>
#include <cmath>
#include <set>
#include <unordered_map>

#include "band_edges.hpp"
#include "condition_value.hpp"
#include "derivation_steps.hpp"
#include "gate_facts.hpp"

namespace steelyard::likelihoods {
namespace {

using detail::GateFacts;
using detail::Known;
using detail::Verdict;

constexpr std::size_t most_quantities = 120;
constexpr std::size_t most_limits = 32;
constexpr std::size_t most_plans = 4096;  // of different sets of entries; beyond, the general way

/// What is known of a panel before anything is computed: the quantities, then three bits.
struct Shape {
    std::array<std::uint64_t, 2> words{};

    void set(std::size_t bit, bool value) noexcept {
        words[bit / 64] |= std::uint64_t{value ? 1U : 0U} << (bit % 64);
    }
    bool test(std::size_t bit) const noexcept { return ((words[bit / 64] >> (bit % 64)) & 1U) != 0; }
    bool operator==(const Shape&) const = default;
};
enum ShapeBit : std::size_t { age_known = most_quantities, sex_known, glycosuria_seen };
struct ShapeHash {
    std::size_t operator()(const Shape& shape) const noexcept {
        return shape.words[0] * 0x9E3779B97F4A7C15U ^ shape.words[1] * 0xC2B2AE3D27D4EB4FU;
    }
};

struct Step {
    int target = 0;
    std::array<int, 6> inputs{};
    std::size_t count = 0;
    detail::PointFormula formula = nullptr;
    bool needed_later = false;  ///< without a value the steps after it would be others
};

/// How panels of one shape are computed.
struct Plan {
    std::vector<Step> steps;
    std::vector<std::size_t> tables;  ///< those whose finding can be known: the others are missing
    GateFacts facts;                  ///< with what all of them have in common
    std::vector<std::pair<Known GateFacts::*, int>> gate;       ///< what is known of the gate's quantities
    std::vector<std::pair<std::size_t, std::size_t>> restated;  ///< limits (taken, original)
};

constexpr std::array gate_quantities = {&GateFacts::serum_bicarbonate,
                                        &GateFacts::arterial_bicarbonate,
                                        &GateFacts::arterial_ph,
                                        &GateFacts::arterial_pco2,
                                        &GateFacts::venous_ph,
                                        &GateFacts::expected_pco2,
                                        &GateFacts::gfr,
                                        &GateFacts::anion_gap,
                                        &GateFacts::anion_gap_corrected,
                                        &GateFacts::serum_lactate,
                                        &GateFacts::serum_beta_hydroxybutyrate};

/// A finding, or one member of a joint one.
struct Locator {
    int quantity = -1;          ///< -1: a feature
    std::vector<double> edges;  ///< less their tolerance: a band begins here
    int feature = -1;
    std::vector<int> band_of_level;  ///< by level of the vocabulary; -1 when the table has no such level
};

struct ConditionPlan {
    const Condition* condition = nullptr;
    int quantity = -1;
    int feature = -1;
    int level = -1;
};

struct TablePlan {
    FindingKind kind{};
    std::vector<Locator> members;  ///< one, or the two of a joint table
    int rows = 0, columns = 0;     ///< of a joint table
    std::vector<ConditionPlan> conditions;
};

struct LimitPlan {
    int quantity = -1;
    std::optional<double> low, high;
};

std::string_view quantity_id(int number) {
    const auto at = static_cast<std::size_t>(number);
    return at < analytes().size() ? analytes()[at].id : derived_quantities()[at - analytes().size()].id;
}

}  // namespace

int quantity_count() {
    return static_cast<int>(analytes().size() + derived_quantities().size());
}

int quantity_number(std::string_view id) noexcept {
    if (const Analyte* analyte = find_analyte(id)) {
        return static_cast<int>(analyte - analytes().data());
    }
    if (const DerivedQuantity* derived = find_derived(id)) {
        return static_cast<int>(analytes().size()) + static_cast<int>(derived - derived_quantities().data());
    }
    return -1;
}

class PointReader::Impl {
  public:
    explicit Impl(const TableSet& set) : set_(&set), vocabulary_(set.vocabulary()) {
        for (const auto& [feature, levels] : vocabulary_.levels) {
            features_.push_back(feature);
        }
        for (const EvidenceTable& table : set.tables) {
            tables_.push_back(plan_of(table));
        }
        for (const UrgentLimit& limit : set.urgent) {
            limits_.push_back({quantity_number(limit.quantity), limit.low, limit.high});
        }
        pregnant_ = present(set.gate.pregnancy_feature);
        alkali_ = present(set.gate.alkali_feature);
        glycosuria_ = present("glycosuria");
        for (const GfrCondition& condition : set.gate.gfr_conditions) {
            const int feature = feature_number(condition.feature);
            gfr_conditions_.push_back({feature, level_number(feature, condition.level)});
        }
        for (const std::string_view id : needed_ids()) {
            if (const int number = quantity_number(id); number >= 0) {
                needed_.set(static_cast<std::size_t>(number));
            }
        }
    }

    int feature_number(std::string_view feature) const noexcept {
        const auto found = std::find(features_.begin(), features_.end(), feature);
        return found == features_.end() ? -1 : static_cast<int>(found - features_.begin());
    }

    int level_number(int feature, std::string_view level) const noexcept {
        if (feature < 0) {
            return -1;
        }
        const auto& levels = vocabulary_.levels.find(features_[static_cast<std::size_t>(feature)])->second;
        const auto found = std::find(levels.begin(), levels.end(), level);
        return found == levels.end() ? -1 : static_cast<int>(found - levels.begin());
    }

    PointPanel empty_panel() const {
        return {std::vector<double>(static_cast<std::size_t>(quantity_count()), not_known),
                std::vector<std::int16_t>(features_.size(), std::int16_t{-1}), not_known, Sex::unknown};
    }

    bool read(PointPanel& panel, BatchReading& reading) {
        Plan* plan = plan_for(panel);
        if (plan == nullptr) {
            return false;
        }
        if (!compute(*plan, panel)) {
            return false;
        }
        reading.code.assign(tables_.size(), static_cast<char>(missing_state));
        for (const std::size_t i : plan->tables) {
            reading.code[i] = static_cast<char>(state_of(tables_[i], panel));
        }
        reading.gate = gate_of(*plan, panel);
        reading.urgent = urgent_of(*plan, panel);
        return true;
    }

  private:
    using FeatureLevel = std::pair<int, int>;

    FeatureLevel present(std::string_view feature) const {
        const int number = feature_number(feature);
        return {number, level_number(number, "present")};
    }
    static bool is(const PointPanel& panel, const FeatureLevel& wanted) {
        return wanted.first >= 0 && wanted.second >= 0 &&
               panel.level[static_cast<std::size_t>(wanted.first)] == wanted.second;
    }
    static double value_of(const PointPanel& panel, int quantity) {
        return panel.value[static_cast<std::size_t>(quantity)];
    }

    std::vector<std::string_view> needed_ids() const {
        std::vector<std::string_view> ids;
        for (const EvidenceTable& table : set_->tables) {
            ids.emplace_back(table.finding);
            ids.insert(ids.end(), table.joint_of.begin(), table.joint_of.end());
            for (const Condition& condition : table.usable_when) {
                ids.emplace_back(condition.subject);
            }
        }
        for (const auto member : gate_quantities) {
            ids.push_back((GateFacts{}.*member).id());
        }
        for (const UrgentLimit& limit : set_->urgent) {
            ids.emplace_back(limit.quantity);
        }
        return ids;
    }

    Locator locator(std::string_view id, const std::vector<double>& edges,
                    const std::vector<std::string>& levels) const {
        Locator where;
        if (levels.empty()) {
            where.quantity = quantity_number(id);
            for (const double edge : edges) {
                where.edges.push_back(edge - detail::edge_tolerance(edge));
            }
            return where;
        }
        where.feature = feature_number(id);
        for (const std::string& level : vocabulary_.levels.find(id)->second) {
            const auto found = std::find(levels.begin(), levels.end(), level);
            where.band_of_level.push_back(found == levels.end() ? -1
                                                                : static_cast<int>(found - levels.begin()));
        }
        return where;
    }

    TablePlan plan_of(const EvidenceTable& table) const {
        (void)states_of(table);  // refuses a table with too many bands
        TablePlan plan;
        plan.kind = table.kind;
        if (table.kind == FindingKind::joint) {
            for (std::size_t member = 0; member < 2; ++member) {
                const bool feature = table.joint_edges[member].empty();
                plan.members.push_back(
                    locator(table.joint_of[member], table.joint_edges[member],
                            feature ? table.joint_names[member] : std::vector<std::string>{}));
            }
            plan.rows = static_cast<int>(table.joint_names[0].size());
            plan.columns = static_cast<int>(table.joint_names[1].size());
        } else {
            plan.members.push_back(locator(table.finding, table.edges, table.levels));
        }
        for (const Condition& condition : table.usable_when) {
            ConditionPlan one{&condition, -1, -1, -1};
            if (condition.is_feature) {
                one.feature = feature_number(condition.subject);
                one.level = level_number(one.feature, condition.level);
            } else {
                one.quantity = quantity_number(condition.subject);
            }
            plan.conditions.push_back(one);
        }
        return plan;
    }

    Shape shape_of(const PointPanel& panel) const {
        Shape shape;
        for (std::size_t i = 0; i < panel.value.size(); ++i) {
            shape.set(i, panel.value[i] == panel.value[i]);  // not NaN
        }
        shape.set(age_known, !std::isnan(panel.age));
        shape.set(sex_known, panel.sex != Sex::unknown);
        shape.set(glycosuria_seen, is(panel, glycosuria_));
        return shape;
    }

    Plan* plan_for(const PointPanel& panel) {
        const Shape shape = shape_of(panel);
        if (last_ != nullptr && shape == last_shape_) {
            return last_;  // rows of one file mostly have the same entries
        }
        auto found = plans_.find(shape);
        if (found == plans_.end()) {
            if (plans_.size() >= most_plans) {
                return nullptr;
            }
            found = plans_.emplace(shape, make_plan(shape)).first;
        }
        last_shape_ = shape;
        last_ = &found->second;
        return last_;
    }

    /// A panel of this shape; its values mean nothing.
    Panel sample(const Shape& shape) const {
        Panel panel;
        const auto entry = [] { return Reading{Interval::point(1.0), {}, {}, {}}; };
        const std::size_t measured = analytes().size();
        for (std::size_t i = 0; i < static_cast<std::size_t>(quantity_count()); ++i) {
            if (shape.test(i) && i < measured) {
                panel.measured.emplace(analytes()[i].id, entry());
            } else if (shape.test(i)) {
                panel.given.emplace(derived_quantities()[i - measured].id, entry());
            }
        }
        if (shape.test(age_known)) {
            panel.age = 50.0;
        }
        panel.sex = shape.test(sex_known) ? Sex::female : Sex::unknown;
        if (shape.test(glycosuria_seen)) {
            panel.observed.emplace("glycosuria", Observation{"present", {}});
        }
        return panel;
    }

    Plan make_plan(const Shape& shape) const {
        const Panel panel = sample(shape);
        std::vector<detail::DerivationStep> all;
        const Quantities quantities = detail::steps_to_derive(panel, set_->gate.chemistry, all);
        Plan plan;
        std::bitset<most_quantities> needed = needed_;
        std::bitset<most_quantities> used_later;
        std::reverse(all.begin(), all.end());  // what later steps need is known before the earlier ones
        for (const detail::DerivationStep& step : all) {
            const auto target = static_cast<std::size_t>(quantity_number(step.id));
            if (!needed.test(target)) {
                continue;
            }
            Step one;
            one.target = static_cast<int>(target);
            one.formula = step.formula;
            one.needed_later = used_later.test(target);
            for (const std::string_view input : step.inputs) {
                one.inputs.at(one.count) = quantity_number(input);
                needed.set(static_cast<std::size_t>(one.inputs.at(one.count)));
                used_later.set(static_cast<std::size_t>(one.inputs.at(one.count)));
                ++one.count;
            }
            plan.steps.push_back(one);
        }
        std::reverse(plan.steps.begin(), plan.steps.end());

        for (std::size_t i = 0; i < tables_.size(); ++i) {
            const auto& members = tables_[i].members;
            const bool can_be_known = std::any_of(members.begin(), members.end(), [&](const Locator& member) {
                return member.quantity < 0 || quantities.find(quantity_id(member.quantity)) != nullptr;
            });
            if (can_be_known) {
                plan.tables.push_back(i);
            }
        }

        plan.facts = detail::gate_facts(panel, quantities, set_->gate);
        for (const auto member : gate_quantities) {
            if (const Known& known = plan.facts.*member; known) {
                plan.gate.emplace_back(member, quantity_number(known.id()));
            }
        }
        for (std::size_t taken = 0; taken < set_->urgent.size(); ++taken) {
            const QuantityValue* quantity = quantities.find(set_->urgent[taken].quantity);
            for (std::size_t original = 0; original < set_->urgent.size(); ++original) {
                if (quantity != nullptr && quantity->origin == Origin::computed &&
                    quantity->from.size() == 1 && quantity->from.front() == set_->urgent[original].quantity) {
                    plan.restated.emplace_back(taken, original);
                }
            }
        }
        return plan;
    }

    bool compute(const Plan& plan, PointPanel& panel) const {
        const detail::FormulaContext context{set_->gate.chemistry, panel.age, panel.sex == Sex::female};
        std::array<double, 6> inputs{};
        for (const Step& step : plan.steps) {
            bool known = true;
            for (std::size_t i = 0; i < step.count; ++i) {
                inputs[i] = value_of(panel, step.inputs[i]);
                known = known && !std::isnan(inputs[i]);
            }
            const double value = known ? step.formula(inputs.data(), context) : not_known;
            if (!std::isfinite(value)) {
                if (step.needed_later) {
                    return false;
                }
                continue;  // the formula has no value here: the quantity is not known
            }
            panel.value[static_cast<std::size_t>(step.target)] = value;
        }
        return true;
    }

    struct Located {
        bool given = false;
        int band = -1;  ///< -1 when not known
    };
    static Located locate(const Locator& where, const PointPanel& panel) {
        if (where.quantity >= 0) {
            const double value = value_of(panel, where.quantity);
            if (std::isnan(value)) {
                return {};
            }
            int band = 0;
            for (const double edge : where.edges) {
                band += value >= edge ? 1 : 0;
            }
            return {true, band};
        }
        const int level = where.feature < 0 ? -1 : panel.level[static_cast<std::size_t>(where.feature)];
        if (level < 0) {
            return {};
        }
        return {true, where.band_of_level[static_cast<std::size_t>(level)]};
    }

    static Verdict check(const ConditionPlan& plan, const PointPanel& panel) {
        if (plan.condition->is_feature) {
            const int level = plan.feature < 0 ? -1 : panel.level[static_cast<std::size_t>(plan.feature)];
            if (level < 0) {
                return Verdict::unknown;
            }
            return level == plan.level ? Verdict::holds : Verdict::fails;
        }
        const double value = plan.quantity < 0 ? not_known : value_of(panel, plan.quantity);
        return std::isnan(value) ? Verdict::unknown
                                 : detail::check_value(*plan.condition, Interval::point(value));
    }

    static bool usable(const TablePlan& plan, const PointPanel& panel) {
        for (const ConditionPlan& condition : plan.conditions) {
            const Verdict verdict = check(condition, panel);
            if (verdict == Verdict::fails ||
                (verdict == Verdict::unknown && condition.condition->set_aside_when_unknown)) {
                return false;
            }
        }
        return true;
    }

    static int state_of(const TablePlan& plan, const PointPanel& panel) {
        const Located first = locate(plan.members[0], panel);
        int band = first.band;
        bool given = first.given;
        if (plan.kind == FindingKind::joint) {
            const Located second = locate(plan.members[1], panel);
            given = first.given || second.given;
            const bool degenerate = plan.rows == 1 || plan.columns == 1;
            const int cells = plan.rows * plan.columns;
            if (first.band >= 0 && (second.band < 0 || (degenerate && plan.columns == 1))) {
                band = cells + first.band;
            } else if (first.band >= 0 && second.band >= 0 && !degenerate) {
                band = first.band * plan.columns + second.band;
            } else if (second.band >= 0) {
                band = cells + plan.rows + second.band;
            }
        }
        if (!given) {
            return missing_state;
        }
        return band >= 0 && usable(plan, panel) ? first_band_state + band : aside_state;
    }

    GateStatus gate_of(Plan& plan, const PointPanel& panel) const {
        GateFacts& facts = plan.facts;
        for (const auto& [member, quantity] : plan.gate) {
            const double value = value_of(panel, quantity);
            Known& known = facts.*member;
            known = std::isnan(value) ? Known(known.id())
                                      : Known(known.id(), Interval::point(value), known.origin());
        }
        facts.age = std::isnan(panel.age) ? std::nullopt : std::optional(panel.age);
        facts.pregnant = is(panel, pregnant_);
        facts.given_alkali = is(panel, alkali_);
        facts.gfr_barred = nullptr;
        for (std::size_t i = 0; i < gfr_conditions_.size() && facts.gfr_barred == nullptr; ++i) {
            const auto& [feature, wanted] = gfr_conditions_[i];
            const int level = feature < 0 ? -1 : panel.level[static_cast<std::size_t>(feature)];
            const GfrCondition& condition = set_->gate.gfr_conditions[i];
            if (level < 0 ? condition.set_aside_when_unknown : level != wanted) {
                facts.gfr_barred = &condition.otherwise;
            }
        }
        return detail::gate_status(facts, set_->gate);
    }

    std::uint64_t urgent_of(const Plan& plan, const PointPanel& panel) const {
        std::uint64_t urgent = 0;
        for (std::size_t i = 0; i < limits_.size(); ++i) {
            const LimitPlan& limit = limits_[i];
            const double value = limit.quantity < 0 ? not_known : value_of(panel, limit.quantity);
            if (std::isnan(value)) {
                continue;
            }
            if (limit.low && !detail::strictly_above(value, *limit.low)) {
                urgent |= std::uint64_t{1} << (2 * i);
            }
            if (limit.high && detail::at_or_above(value, *limit.high)) {
                urgent |= std::uint64_t{2} << (2 * i);
            }
        }
        const std::uint64_t all = urgent;
        for (const auto& [taken, original] : plan.restated) {
            urgent &= ~(((all >> (2 * original)) & 3U) << (2 * taken));
        }
        return urgent;
    }

    const TableSet* set_;
    FeatureVocabulary vocabulary_;
    std::vector<std::string> features_;
    std::vector<TablePlan> tables_;
    std::vector<LimitPlan> limits_;
    FeatureLevel pregnant_{-1, -1}, alkali_{-1, -1}, glycosuria_{-1, -1};
    std::vector<FeatureLevel> gfr_conditions_;
    std::bitset<most_quantities> needed_;
    std::unordered_map<Shape, Plan, ShapeHash> plans_;
    Shape last_shape_;
    Plan* last_ = nullptr;
};

BatchReading batch_reading(const TableSet& set, const Pattern& pattern, const GateResult& gate,
                           const std::vector<UrgentValue>& urgent) {
    BatchReading reading{code_of(set, pattern), gate.status, 0};
    for (const UrgentValue& value : urgent) {
        for (std::size_t i = 0; i < std::min(set.urgent.size(), most_limits); ++i) {
            const UrgentLimit& limit = set.urgent[i];
            const std::optional<double>& side = value.is_low ? limit.low : limit.high;
            if (limit.quantity == value.quantity && side && *side == value.limit) {
                reading.urgent |= std::uint64_t{value.is_low ? 1U : 2U} << (2 * i);
            }
        }
    }
    return reading;
}

bool PointReader::can_read(const TableSet& set) {
    return set.urgent.size() <= most_limits && static_cast<std::size_t>(quantity_count()) <= most_quantities;
}

PointReader::PointReader(const TableSet& set) : impl_(std::make_unique<Impl>(set)) {}
PointReader::PointReader(PointReader&&) noexcept = default;
PointReader& PointReader::operator=(PointReader&&) noexcept = default;
PointReader::~PointReader() = default;

PointPanel PointReader::empty_panel() const {
    return impl_->empty_panel();
}
int PointReader::feature_number(std::string_view feature) const noexcept {
    return impl_->feature_number(feature);
}
int PointReader::level_number(int feature, std::string_view level) const noexcept {
    return impl_->level_number(feature, level);
}
bool PointReader::read(PointPanel& panel, BatchReading& reading) {
    return impl_->read(panel, reading);
}

}  // namespace steelyard::likelihoods
