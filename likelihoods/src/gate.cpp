// SPDX-License-Identifier: Apache-2.0
// The gate asks its questions in the order a clinician would: is the patient an adult; is bicarbonate low
// because of a metabolic acidosis; does the gas agree with itself; is the gap normal. Each answer is a
// sentence and a gravity.

#include "steelyard/likelihoods/gate.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <utility>

#include "steelyard/likelihoods/chemistry.hpp"
#include "wording.hpp"

namespace steelyard::likelihoods {
namespace {

/// Middle of the normal range of arterial pH: compensation of one disorder does not carry pH past it. Basis:
/// practice.
constexpr double middle_ph = 7.40;
/// A gap below this is unusually low [mmol/L]: the low end of the analyser-specific reference intervals.
/// RASTEGAR2007.
constexpr double low_gap = 3.0;
/// By how far below or above its reference an unknown albumin is reckoned with [g/L]. Basis: elicited.
constexpr double albumin_doubt = 10.0;

/// Four significant digits: enough to tell a value from its limit, too few to show rounding noise.
std::string number(double value) {
    return fmt::format("{:.4g}", value == 0.0 ? 0.0 : value);
}

std::string amount(double value, std::string_view ucum) {
    return number(value) + detail::unit_after_number(ucum);
}

std::string mmol(double value) {
    return amount(value, "mmol/L");
}
std::string mm_hg(double value) {
    return amount(value, "mm[Hg]");
}

/// A value in a sentence, with one number for a point and both ends for a censored one.
std::string in_words(const Interval& value, std::string_view ucum) {
    return value.is_point() ? amount(value.low, ucum)
                            : fmt::format("between {} and {}", number(value.low), amount(value.high, ucum));
}

/// A comparison with a censored value may have no answer.
enum class Answer { no, yes, unknown };

Answer is_below(const Interval& value, double limit) {
    if (value.high < limit || (value.high == limit && value.high_open)) {
        return Answer::yes;
    }
    return value.low >= limit ? Answer::no : Answer::unknown;
}

Answer is_above(const Interval& value, double limit) {
    if (value.low > limit || (value.low == limit && value.low_open)) {
        return Answer::yes;
    }
    return value.high <= limit ? Answer::no : Answer::unknown;
}

/// A quantity that may be unknown; every comparison with an unknown one is unknown.
class Known {
  public:
    Known(const Quantities& quantities, std::string_view id) : quantity_(quantities.find(id)) {}
    explicit operator bool() const { return quantity_ != nullptr; }
    const Interval& value() const { return quantity_->value; }
    bool is_point() const { return quantity_ != nullptr && quantity_->value.is_point(); }
    double point() const { return quantity_->value.low; }
    const QuantityValue& quantity() const { return *quantity_; }
    Answer below(double limit) const {
        return quantity_ ? is_below(quantity_->value, limit) : Answer::unknown;
    }
    Answer above(double limit) const {
        return quantity_ ? is_above(quantity_->value, limit) : Answer::unknown;
    }
    std::string words() const { return in_words(quantity_->value, quantity_->unit); }

  private:
    const QuantityValue* quantity_;
};

class Examination {
  public:
    Examination(const Panel& panel, const Quantities& quantities, const GateSettings& settings)
        : panel_(panel),
          quantities_(quantities),
          settings_(settings),
          bicarbonate_(quantities, "serum_bicarbonate"),
          ph_(quantities, "arterial_ph"),
          pco2_(quantities, "arterial_pco2"),
          expected_pco2_(quantities, "expected_pco2"),
          gfr_(quantities, "gfr"),
          gap_(quantities, "anion_gap"),
          corrected_(quantities, "anion_gap_corrected") {}

    GateResult run() && {
        age();
        acidosis();
        gas_consistency();
        gap();
        GateResult result;
        std::stable_sort(reasons_.begin(), reasons_.end(),
                         [](const auto& a, const auto& b) { return a.first > b.first; });
        for (auto& [status, words] : reasons_) {
            result.status = std::max(result.status, status);
            result.reasons.push_back(std::move(words));
        }
        for (const std::string_view id :
             {"anion_gap", "anion_gap_corrected", "expected_pco2", "delta_ratio", "bicarbonate_from_gas"}) {
            if (const Known known(quantities_, id); known.is_point()) {
                result.quantities.emplace_back(id, known.point());
            }
        }
        return result;
    }

  private:
    void say(GateStatus status, std::string words) { reasons_.emplace_back(status, std::move(words)); }

    bool alkali_is_given() const {
        const auto seen = panel_.observed.find(settings_.alkali_feature);
        return !settings_.alkali_feature.empty() && seen != panel_.observed.end() &&
               seen->second.level == "present";
    }

    void age() {
        const double least = settings_.age_least.value;
        if (panel_.age && *panel_.age < least) {
            say(GateStatus::out_of_scope, fmt::format("age {} is below {}: the tables are for adults",
                                                      amount(*panel_.age, "a"), amount(least, "a")));
        }
    }

    void acidosis() {
        const double limit = settings_.bicarbonate_low.value;
        if (!bicarbonate_) {
            say(GateStatus::caution, "acidosis could not be confirmed: no bicarbonate was given");
            return;
        }
        switch (bicarbonate_.below(limit)) {
            case Answer::yes:
                say(GateStatus::in_scope,
                    fmt::format("bicarbonate {} is below {}", bicarbonate_.words(), mmol(limit)));
                compensation();
                return;
            case Answer::no:
                bicarbonate_not_low();
                return;
            case Answer::unknown:
                say(GateStatus::caution,
                    fmt::format("acidosis could not be confirmed: bicarbonate is {}, on either "
                                "side of {}",
                                bicarbonate_.words(), mmol(limit)));
                return;
        }
    }

    void bicarbonate_not_low() {
        const double limit = settings_.bicarbonate_low.value;
        if (ph_.below(settings_.ph_low.value) == Answer::yes) {
            say(GateStatus::out_of_scope,
                fmt::format(
                    "respiratory acidosis: arterial pH {} is below {} while bicarbonate {} is not below {}",
                    ph_.words(), number(settings_.ph_low.value), bicarbonate_.words(), mmol(limit)));
        } else if (alkali_is_given()) {
            say(GateStatus::caution,
                fmt::format(
                    "bicarbonate is not low while alkali is given ({}, limit {}); the panel is read as a "
                    "treated acidosis",
                    bicarbonate_.words(), mmol(limit)));
        } else {
            say(GateStatus::out_of_scope, fmt::format("no metabolic acidosis: bicarbonate {} is not below {}",
                                                      bicarbonate_.words(), mmol(limit)));
        }
    }

    /// With a low bicarbonate: is it the acidosis, or the kidney's answer to a respiratory alkalosis; is
    /// breathing as expected? A range of expected pCO2 is compared by its nearer end, so that only a certain
    /// misfit is reported.
    void compensation() {
        if (!ph_ && !pco2_) {
            say(GateStatus::in_scope,
                "no arterial gas was given: a respiratory alkalosis, which also lowers bicarbonate, is not "
                "excluded");
            return;
        }
        const double alkalaemia = settings_.ph_high.value;
        if (ph_.above(alkalaemia) == Answer::yes) {
            say(GateStatus::out_of_scope,
                fmt::format(
                    "primary respiratory alkalosis: bicarbonate is low while arterial pH {} is above {}",
                    ph_.words(), number(alkalaemia)));
            return;
        }
        const Answer acidaemic = ph_.below(settings_.ph_low.value);
        if (acidaemic == Answer::yes) {
            say(GateStatus::in_scope,
                fmt::format("arterial pH {} is below {}", ph_.words(), number(settings_.ph_low.value)));
        } else if (acidaemic == Answer::no) {
            say(GateStatus::in_scope,
                fmt::format("arterial pH {} is not below {}: the acidosis is compensated or mixed",
                            ph_.words(), number(settings_.ph_low.value)));
        }
        if (!pco2_ || !expected_pco2_) {
            return;
        }
        const double band = settings_.expected_pco2_band.value;
        const std::string measured = fmt::format("pCO2 {} is", pco2_.words());
        const std::string expected =
            fmt::format("the expected {} (within {})", expected_pco2_.words(), mm_hg(band));
        if (pco2_.above(expected_pco2_.value().high + band) == Answer::yes) {
            say(GateStatus::caution,
                fmt::format("added respiratory acidosis: {} above {}", measured, expected));
        } else if (pco2_.below(expected_pco2_.value().low - band) == Answer::yes) {
            if (ph_.below(middle_ph) == Answer::no) {
                say(GateStatus::out_of_scope,
                    fmt::format(
                        "primary respiratory alkalosis: {} below {} and arterial pH {} is not below {}",
                        measured, expected, ph_.words(), number(middle_ph)));
            } else {
                say(GateStatus::caution, fmt::format("{} respiratory alkalosis: {} below {}",
                                                     ph_ ? "added" : "added or primary", measured, expected));
            }
        } else if (pco2_.is_point() && expected_pco2_.is_point()) {
            say(GateStatus::in_scope, fmt::format("{} as expected, {}", measured, expected.substr(4)));
        }
    }

    /// pH, pCO2 and bicarbonate must satisfy the Henderson-Hasselbalch equation. A bicarbonate that was
    /// itself computed from them says nothing. A gas may be off in one of the two measures without meaning
    /// much; both must be exceeded.
    void gas_consistency() {
        if (!ph_.is_point() || !pco2_.is_point()) {
            return;
        }
        for (const std::string_view id : {"arterial_bicarbonate", "serum_bicarbonate"}) {
            const Known bicarbonate(quantities_, id);
            if (!bicarbonate.is_point()) {
                continue;
            }
            const bool measured = bicarbonate.quantity().origin == Origin::measured;
            const auto& from = bicarbonate.quantity().from;
            const bool from_total_co2 = std::find(from.begin(), from.end(), "serum_total_co2") != from.end();
            if (measured || from_total_co2) {
                compare_gas(id == "arterial_bicarbonate" ? "arterial bicarbonate" : "serum bicarbonate",
                            bicarbonate.point());
            }
        }
    }

    void compare_gas(std::string_view what, double bicarbonate) {
        const double implied = chemistry::bicarbonate_from_gas(ph_.point(), pco2_.point());
        const double implied_ph = chemistry::ph_from_gas(bicarbonate, pco2_.point());
        const double miss = std::abs(bicarbonate - implied);
        const double ph_miss = std::abs(ph_.point() - implied_ph);
        const auto both_exceed = [&](double times) {
            return miss > times * settings_.gas_bicarbonate.value && ph_miss > times * settings_.gas_ph.value;
        };
        if (!both_exceed(1.0)) {
            return;
        }
        const bool gross = both_exceed(2.0);
        say(gross ? GateStatus::out_of_scope : GateStatus::caution,
            fmt::format("the blood gas {}: pH {} and pCO2 {} give a bicarbonate of {}, but {} is {} "
                        "(tolerated: {} and "
                        "pH {})",
                        gross ? "contradicts itself" : "does not quite agree", ph_.words(), pco2_.words(),
                        mmol(implied), what, mmol(bicarbonate), mmol(settings_.gas_bicarbonate.value),
                        number(settings_.gas_ph.value)));
    }

    void gap() {
        if (corrected_) {
            corrected_gap();
        } else if (gap_) {
            uncorrected_gap();
        } else {
            say(GateStatus::caution,
                "the anion gap is not known (sodium, chloride and bicarbonate are needed): a normal gap was "
                "not confirmed");
            return;
        }
        if (const Known ratio(quantities_, "delta_ratio"); ratio.is_point()) {
            const double share = 100.0 * ratio.point();
            say(GateStatus::in_scope,
                ratio.point() > 0.0
                    ? fmt::format(
                          "delta ratio {}: the rise of the gap accounts for {} % of the fall in bicarbonate",
                          fmt::format("{:.2f}", ratio.point()), fmt::format("{:.0f}", share))
                    : fmt::format("delta ratio {}: the gap has not risen",
                                  fmt::format("{:.2f}", ratio.point())));
        }
    }

    bool gfr_is_reduced() const { return gfr_.below(settings_.gfr_reduced_below.value) == Answer::yes; }
    bool gfr_is_not_reduced() const { return gfr_.below(settings_.gfr_reduced_below.value) == Answer::no; }

    std::string reduced_gfr_in_words() const {
        return fmt::format("GFR {} is below {}", gfr_.words(),
                           amount(settings_.gfr_reduced_below.value, "mL/min/{1.73_m2}"));
    }

    void corrected_gap() {
        const double normal_to = settings_.gap_normal_to.value;
        const double high_from = settings_.gap_high_from.value;
        const std::string what = fmt::format("anion gap corrected for albumin {}", corrected_.words());
        if (corrected_.above(normal_to) == Answer::no) {
            say(GateStatus::in_scope, fmt::format("{} is normal, not above {}", what, mmol(normal_to)));
        } else if (corrected_.above(high_from) == Answer::yes) {
            high_gap(fmt::format("{} is above {}", what, mmol(high_from)));
        } else if (gfr_is_reduced()) {
            say(GateStatus::in_scope,
                fmt::format("{} is above {} but not clearly above {}; {}, which may account for it", what,
                            mmol(normal_to), mmol(high_from), reduced_gfr_in_words()));
        } else {
            say(GateStatus::caution,
                fmt::format("{} is above {} but not clearly above {}: a normal gap was not confirmed", what,
                            mmol(normal_to), mmol(high_from)));
        }
        remark_low_gap(corrected_, what);
    }

    void high_gap(const std::string& finding) {
        if (gfr_is_reduced()) {
            say(GateStatus::in_scope,
                fmt::format(
                    "{}; {}: renal failure, which raises the gap, is among the causes, but other unmeasured "
                    "acids (lactate, ketones, toxins) must be excluded",
                    finding, reduced_gfr_in_words()));
        } else if (gfr_is_not_reduced()) {
            say(GateStatus::out_of_scope, fmt::format("{} and GFR {} is not reduced: a high-gap acidosis "
                                                      "(lactate, ketones, toxins), which these "
                                                      "tables do not weigh",
                                                      finding, gfr_.words()));
        } else {
            say(GateStatus::caution,
                fmt::format("{} and GFR is not known: lactate, ketones and toxins must be excluded",
                            finding));
        }
    }

    /// Albumin is unknown. A low one would hide a raised gap, a high one feign it: a gap within that doubt of
    /// a limit is a caution, one that is clear of it is read as it stands.
    void uncorrected_gap() {
        const double normal_to = settings_.gap_normal_to.value;
        const double high_from = settings_.gap_high_from.value;
        const double doubt = settings_.chemistry.albumin_slope * albumin_doubt;
        const std::string what =
            fmt::format("anion gap {}, not corrected since albumin is not known,", gap_.words());
        if (gap_.above(normal_to - doubt) == Answer::no) {
            say(GateStatus::in_scope,
                fmt::format("{} is normal, not above {}; it would be higher if albumin is low", what,
                            mmol(normal_to)));
        } else if (gap_.above(high_from + doubt) == Answer::yes) {
            high_gap(fmt::format("{} is above {}", what, mmol(high_from)));
        } else {
            say(GateStatus::caution,
                fmt::format("{} lies too near the limits ({} and {}) to be read without albumin", what,
                            mmol(normal_to), mmol(high_from)));
        }
        remark_low_gap(gap_, what);
    }

    void remark_low_gap(const Known& gap, const std::string& what) {
        if (gap.below(low_gap) == Answer::yes) {
            say(GateStatus::in_scope,
                fmt::format(
                    "{} is below {}: think of lithium, bromide, a paraprotein, or an error of measurement",
                    what, mmol(low_gap)));
        }
    }

    const Panel& panel_;
    const Quantities& quantities_;
    const GateSettings& settings_;
    Known bicarbonate_;
    Known ph_;
    Known pco2_;
    Known expected_pco2_;
    Known gfr_;
    Known gap_;
    Known corrected_;
    std::vector<std::pair<GateStatus, std::string>> reasons_;
};

}  // namespace

std::string_view to_string(GateStatus status) noexcept {
    switch (status) {
        case GateStatus::in_scope:
            return "in_scope";
        case GateStatus::caution:
            return "caution";
        case GateStatus::out_of_scope:
            return "out_of_scope";
    }
    return "";
}

GateResult gate(const Panel& panel, const Quantities& quantities, const GateSettings& settings) {
    return Examination(panel, quantities, settings).run();
}

}  // namespace steelyard::likelihoods
