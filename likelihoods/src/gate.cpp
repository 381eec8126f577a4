// SPDX-License-Identifier: Apache-2.0
// The gate asks its questions in the order a clinician would: is the patient an adult and not pregnant; does
// the gas agree with itself; is bicarbonate low because of a metabolic acidosis; is the gap normal. Each
// answer is a sentence and a gravity.

#include "steelyard/likelihoods/gate.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <utility>

#include "gate_facts.hpp"
#include "steelyard/likelihoods/chemistry.hpp"
#include "steelyard/likelihoods/interval_words.hpp"
#include "wording.hpp"

namespace steelyard::likelihoods {
namespace {

using detail::Answer;
using detail::GateFacts;
using detail::Known;

/// Middle of the normal range of arterial pH: compensation of one disorder does not carry pH past it. Basis:
/// practice.
constexpr double middle_ph = 7.40;
/// A gap below this is unusually low [mmol/L]: the low end of the analyser-specific reference intervals.
/// RASTEGAR2007.
constexpr double low_gap = 3.0;
/// By how far below or above its reference an unknown albumin is reckoned with [g/L]. Basis: elicited.
constexpr double albumin_doubt = 10.0;

/// What the gate looks at, beside the features its settings name.
constexpr auto inputs = std::to_array<std::string_view>({
    "serum_bicarbonate",
    "serum_total_co2",
    "arterial_ph",
    "arterial_pco2",
    "arterial_bicarbonate",
    "venous_ph",
    "venous_pco2",
    "venous_bicarbonate",
    "serum_sodium",
    "serum_chloride",
    "serum_albumin",
    "serum_lactate",
    "serum_beta_hydroxybutyrate",
    "anion_gap",
    "anion_gap_corrected",
    "delta_ratio",
    "bicarbonate_from_gas",
    "expected_pco2",
    "gfr",
});

std::string mmol(double value) {
    return detail::decimal(value, {0, 2}) + " mmol/L";
}
std::string mm_hg(double value) {
    return detail::decimal(value, {0, 1}) + " mmHg";
}
std::string ph(double value) {
    return detail::decimal(value, {2, 3});
}

class Examination {
  public:
    /// @param in_words  whether the reasons are wanted, or only the status
    Examination(const GateFacts& facts, const GateSettings& settings, bool in_words)
        : facts_(facts),
          settings_(settings),
          in_words_(in_words),
          bicarbonate_(facts.serum_bicarbonate),
          ph_(facts.arterial_ph),
          pco2_(facts.arterial_pco2),
          venous_ph_(facts.venous_ph),
          expected_pco2_(facts.expected_pco2),
          gfr_(facts.gfr),
          gap_(facts.anion_gap),
          corrected_(facts.anion_gap_corrected) {}

    GateStatus run() {
        patient();
        gas_consistency();
        acidosis();
        gap();
        return status_;
    }

    /// In words, the gravest first.
    std::vector<std::string> reasons() && {
        std::stable_sort(reasons_.begin(), reasons_.end(),
                         [](const auto& a, const auto& b) { return a.first > b.first; });
        std::vector<std::string> words;
        for (auto& [status, sentence] : reasons_) {
            words.push_back(std::move(sentence));
        }
        return words;
    }

  private:
    /// @param words  called only when the reason is wanted
    template <class Words>
    void say(GateStatus status, const Words& words) {
        status_ = std::max(status_, status);
        if (in_words_) {
            reasons_.emplace_back(status, words());
        }
    }

    void patient() {
        const double least = settings_.age_least.value;
        if (!facts_.age) {
            say(GateStatus::in_scope, [&] { return "age was not given: the tables are for adults"; });
        } else if (*facts_.age < least) {
            say(GateStatus::out_of_scope, [&] {
                return fmt::format("age {}{} is below {}{}: the tables are for adults",
                                   detail::decimal_beside(*facts_.age, least, {0, 1}),
                                   detail::unit_after_number("a"), detail::decimal(least, {0, 1}),
                                   detail::unit_after_number("a"));
            });
        }
        if (facts_.pregnant) {
            say(GateStatus::caution, [&] {
                return "pregnancy lowers bicarbonate by hyperventilation; the tables do not speak of it";
            });
        }
    }

    /// Bicarbonate with, where it was not measured as such, what it was taken from.
    std::string bicarbonate_words() const {
        std::string words = bicarbonate_.words_beside(settings_.bicarbonate_low.value);
        if (bicarbonate_.origin() != Origin::computed || facts_.bicarbonate_taken_from.empty()) {
            return words;
        }
        const std::string_view from = facts_.bicarbonate_taken_from;
        if (from == "serum_total_co2" && facts_.serum_total_co2) {
            return fmt::format("{} (total CO2 {} less {})", words,
                               interval_in_words(facts_.serum_total_co2.value(), 3),
                               detail::decimal(chemistry::dissolved_co2, {0, 1}));
        }
        const std::string_view vessel = from.starts_with("venous") ? "venous" : "arterial";
        return from.ends_with("bicarbonate")
                   ? fmt::format("{} (from the {} gas)", words, vessel)
                   : fmt::format("{} (computed from {} pH and pCO2)", words, vessel);
    }

    void acidosis() {
        const double limit = settings_.bicarbonate_low.value;
        if (!bicarbonate_) {
            say(GateStatus::caution,
                [&] { return "acidosis could not be confirmed: no bicarbonate was given"; });
            return;
        }
        switch (bicarbonate_.below(limit)) {
            case Answer::yes:
                say(GateStatus::in_scope, [&] {
                    return fmt::format("bicarbonate {} is below {}", bicarbonate_words(), mmol(limit));
                });
                compensation();
                return;
            case Answer::no:
                bicarbonate_not_low();
                return;
            case Answer::unknown:
                say(GateStatus::caution, [&] {
                    return fmt::format(
                        "acidosis could not be confirmed: bicarbonate is {}, on either "
                        "side of {}",
                        bicarbonate_words(), mmol(limit));
                });
                return;
        }
    }

    /// Acidaemia without a low bicarbonate is respiratory only if pCO2 is high; otherwise the acidosis is
    /// mild, or treated, or a metabolic alkalosis stands beside it.
    void bicarbonate_not_low() {
        const double limit = settings_.bicarbonate_low.value;
        const double acidaemia = settings_.ph_low.value;
        const double hypercapnia = settings_.pco2_high.value;
        if (ph_.below(acidaemia) == Answer::yes) {
            const auto finding = [&] {
                return fmt::format("arterial pH {} is below {} while bicarbonate {} is not below {}",
                                   ph_.words_beside(acidaemia), ph(acidaemia), bicarbonate_words(),
                                   mmol(limit));
            };
            if (pco2_.above(hypercapnia) == Answer::yes && gas_agrees_) {
                say(GateStatus::out_of_scope, [&] {
                    return fmt::format("respiratory acidosis: {} and pCO2 {} is above {}", finding(),
                                       pco2_.words_beside(hypercapnia), mm_hg(hypercapnia));
                });
            } else {
                say(GateStatus::caution, [&] { return finding() + ": a mild, treated or mixed disorder"; });
            }
        } else if (facts_.given_alkali) {
            say(GateStatus::caution, [&] {
                return fmt::format(
                    "bicarbonate is not low while alkali is given ({}, limit {}); the panel is read as a "
                    "treated acidosis",
                    bicarbonate_words(), mmol(limit));
            });
        } else {
            say(GateStatus::out_of_scope, [&] {
                return fmt::format("no metabolic acidosis: bicarbonate {} is not below {}",
                                   bicarbonate_words(), mmol(limit));
            });
        }
    }

    /// With a low bicarbonate: is it the acidosis, or the kidney's answer to a respiratory alkalosis; is
    /// breathing as expected? A range of expected pCO2 is compared by its nearer end, so that only a certain
    /// misfit is reported. A gas that contradicts itself is not judged.
    void compensation() {
        if (!ph_ && !pco2_) {
            without_arterial_gas();
            return;
        }
        if (!gas_agrees_) {
            return;
        }
        const double alkalaemia = settings_.ph_high.value;
        if (ph_.above(alkalaemia) == Answer::yes) {
            say(GateStatus::out_of_scope, [&] {
                return fmt::format(
                    "primary respiratory alkalosis: bicarbonate is low while arterial pH {} is above {}",
                    ph_.words_beside(alkalaemia), ph(alkalaemia));
            });
            return;
        }
        const double acidaemia = settings_.ph_low.value;
        const Answer acidaemic = ph_.below(acidaemia);
        if (acidaemic == Answer::yes) {
            say(GateStatus::in_scope, [&] {
                return fmt::format("arterial pH {} is below {}", ph_.words_beside(acidaemia), ph(acidaemia));
            });
        } else if (acidaemic == Answer::no) {
            say(GateStatus::in_scope, [&] {
                return fmt::format("arterial pH {} is not below {}: the acidosis is compensated or mixed",
                                   ph_.words_beside(acidaemia), ph(acidaemia));
            });
        }
        if (pco2_ && expected_pco2_) {
            breathing();
        }
    }

    void breathing() {
        const double band = settings_.expected_pco2_band.value;
        const double highest = expected_pco2_.value().high + band;
        const double lowest = expected_pco2_.value().low - band;
        const auto expected = [&] {
            return fmt::format("the expected {} (within {})", expected_pco2_.words(), mm_hg(band));
        };
        if (pco2_.above(highest) == Answer::yes) {
            say(GateStatus::caution, [&] {
                return fmt::format("added respiratory acidosis: pCO2 {} is above {}",
                                   pco2_.words_beside(highest), expected());
            });
        } else if (pco2_.below(lowest) == Answer::yes) {
            const auto measured = [&] { return fmt::format("pCO2 {} is", pco2_.words_beside(lowest)); };
            if (ph_.below(middle_ph) == Answer::no) {
                say(GateStatus::out_of_scope, [&] {
                    return fmt::format(
                        "primary respiratory alkalosis: {} below {} and arterial pH {} is not below {}",
                        measured(), expected(), ph_.words_beside(middle_ph), ph(middle_ph));
                });
            } else {
                say(GateStatus::caution, [&] {
                    return fmt::format("{} respiratory alkalosis: {} below {}",
                                       ph_ ? "added" : "added or primary", measured(), expected());
                });
            }
        } else if (pco2_.is_point() && expected_pco2_.is_point()) {
            say(GateStatus::in_scope, [&] {
                return fmt::format("pCO2 {} is as expected, {}", pco2_.words(), expected().substr(4));
            });
        }
    }

    /// Venous pH lies a little below arterial pH (about 0.03; basis: memory), so that a low one tells that
    /// the arterial one is not high. Venous pCO2 depends on the flow through the tissue and tells nothing of
    /// breathing.
    void without_arterial_gas() {
        if (!venous_ph_) {
            say(GateStatus::in_scope, [&] {
                return "no arterial gas was given: a respiratory alkalosis, which also lowers bicarbonate, "
                       "is not "
                       "excluded";
            });
            return;
        }
        const double acidaemia = settings_.ph_low.value;
        const double alkalaemia = settings_.ph_high.value;
        const std::string_view limits = "breathing cannot be judged from a venous gas";
        if (venous_ph_.below(acidaemia) == Answer::yes) {
            say(GateStatus::in_scope, [&] {
                return fmt::format("venous pH {} speaks against a primary respiratory alkalosis; {}",
                                   venous_ph_.words(), limits);
            });
        } else if (venous_ph_.above(alkalaemia) == Answer::yes) {
            say(GateStatus::caution, [&] {
                return fmt::format(
                    "venous pH {} is above {}, and arterial pH lies a little higher still: think of a "
                    "primary respiratory alkalosis; {}",
                    venous_ph_.words_beside(alkalaemia), ph(alkalaemia), limits);
            });
        } else {
            say(GateStatus::in_scope, [&] {
                return fmt::format(
                    "venous pH {} does not exclude a respiratory alkalosis, which also lowers "
                    "bicarbonate; {}",
                    venous_ph_.words(), limits);
            });
        }
    }

    /// pH, pCO2 and bicarbonate must satisfy the Henderson-Hasselbalch equation. A bicarbonate that was
    /// itself computed from them says nothing. A gas may be off in one of the two measures without meaning
    /// much; both must be exceeded.
    void gas_consistency() {
        if (!ph_.is_point() || !pco2_.is_point()) {
            return;
        }
        for (const Known* bicarbonate : {&facts_.arterial_bicarbonate, &facts_.serum_bicarbonate}) {
            if (!bicarbonate->is_point()) {
                continue;
            }
            if (bicarbonate->origin() == Origin::measured ||
                (bicarbonate == &facts_.serum_bicarbonate && facts_.bicarbonate_from_total_co2)) {
                compare_gas(bicarbonate == &facts_.arterial_bicarbonate ? "arterial bicarbonate"
                                                                        : "serum bicarbonate",
                            *bicarbonate);
            }
        }
    }

    void compare_gas(std::string_view what, const Known& bicarbonate) {
        const double implied = chemistry::bicarbonate_from_gas(ph_.point(), pco2_.point());
        const double implied_ph = chemistry::ph_from_gas(bicarbonate.point(), pco2_.point());
        const double miss = std::abs(bicarbonate.point() - implied);
        const double ph_miss = std::abs(ph_.point() - implied_ph);
        const auto both_exceed = [&](double times) {
            const auto exceeds = [times](double value, double limit) {
                return detail::is_above(Interval::point(value), times * limit) == Answer::yes;
            };
            return exceeds(miss, settings_.gas_bicarbonate.value) && exceeds(ph_miss, settings_.gas_ph.value);
        };
        if (!both_exceed(1.0)) {
            return;
        }
        gas_agrees_ = false;
        const bool gross = both_exceed(2.0);
        say(gross ? GateStatus::out_of_scope : GateStatus::caution, [&] {
            return fmt::format(
                "the blood gas {}: pH {} and pCO2 {} give a bicarbonate of {}, but {} is {} "
                "(tolerated: {} and pH {}); check the transcription or repeat the gas",
                gross ? "contradicts itself" : "does not quite agree", ph_.words(), pco2_.words(),
                detail::decimal(implied, {0, 1}) + " mmol/L", what, bicarbonate.words(),
                mmol(settings_.gas_bicarbonate.value), ph(settings_.gas_ph.value));
        });
    }

    void gap() {
        Answer high = Answer::unknown;
        if (corrected_) {
            high = corrected_gap();
        } else if (gap_) {
            high = uncorrected_gap();
        } else {
            say(GateStatus::caution, [&] {
                return "the anion gap is not known (sodium, chloride and bicarbonate are needed): a normal "
                       "gap was "
                       "not confirmed";
            });
        }
        measured_acid(facts_.serum_lactate, "lactate", settings_.lactate_high.value, "lactic acidosis", high);
        measured_acid(facts_.serum_beta_hydroxybutyrate, "beta-hydroxybutyrate", settings_.ketones_high.value,
                      "ketoacidosis", high);
        if (corrected_ || gap_) {
            delta_ratio();
        }
    }

    /// A ratio is judged as it is shown, to two decimals.
    void delta_ratio() {
        const Known& ratio = facts_.delta_ratio;
        if (!in_words_ || !ratio.is_point()) {
            return;
        }
        const double shown = std::round(100.0 * ratio.point()) / 100.0;
        std::string meaning = "the gap has not risen";
        if (shown > 1.0) {
            meaning =
                "the gap has risen by more than bicarbonate has fallen: think of a metabolic alkalosis "
                "beside it, or a high bicarbonate before";
        } else if (ratio.point() > 0.0) {
            meaning = fmt::format("the rise of the gap accounts for {:.0f} % of the fall in bicarbonate",
                                  100.0 * ratio.point());
        }
        say(GateStatus::in_scope, [&] { return fmt::format("delta ratio {}: {}", ratio.words(), meaning); });
    }

    /// An unmeasured acid that was measured after all. With a high gap it is the answer, and not one of the
    /// tables'.
    void measured_acid(const Known& acid, std::string_view name, double limit, std::string_view disorder,
                       Answer gap_is_high) {
        const Answer above = acid.above(limit);
        if (!acid || above == Answer::no) {
            return;
        }
        const auto finding = [&] {
            return fmt::format("{} {} {} above {}", name, acid.words_beside(limit),
                               above == Answer::yes ? "is" : "may be", mmol(limit));
        };
        if (above == Answer::yes && gap_is_high == Answer::yes) {
            say(GateStatus::out_of_scope, [&] {
                return fmt::format("{}: a {}, which these tables do not weigh", finding(), disorder);
            });
        } else if (gap_is_high == Answer::no) {
            say(GateStatus::caution, [&] {
                return fmt::format("{} though the gap is not high: a {} beside it is not excluded", finding(),
                                   disorder);
            });
        } else {
            say(GateStatus::caution,
                [&] { return fmt::format("{}: a {} is not excluded", finding(), disorder); });
        }
    }

    /// `lactate, ketones and toxins`, without those that were measured and are not raised.
    std::string acids_to_exclude() const {
        std::vector<std::string> acids;
        if (facts_.serum_lactate.above(settings_.lactate_high.value) != Answer::no) {
            acids.emplace_back("lactate");
        }
        if (facts_.serum_beta_hydroxybutyrate.above(settings_.ketones_high.value) != Answer::no) {
            acids.emplace_back("ketones");
        }
        acids.emplace_back("toxins");
        return detail::listed_in_words(acids);
    }

    Answer gfr_is_reduced() const {
        return facts_.gfr_barred == nullptr ? gfr_.below(settings_.gfr_reduced_below.value) : Answer::unknown;
    }

    std::string gfr_words() const {
        const bool estimated = gfr_.origin() == Origin::computed;
        return fmt::format("GFR {}{}", gfr_.words_beside(settings_.gfr_reduced_below.value),
                           estimated ? " (estimated from creatinine)" : "");
    }

    std::string reduced_gfr_words() const {
        return fmt::format("{} is below {}", gfr_words(),
                           gfr_.limit_words(settings_.gfr_reduced_below.value));
    }

    /// Why it is not known whether GFR is reduced.
    std::string unknown_gfr_words() const {
        if (!gfr_) {
            return "GFR is not known";
        }
        if (facts_.gfr_barred != nullptr) {
            return fmt::format("{} is not used ({})", gfr_words(), *facts_.gfr_barred);
        }
        return fmt::format("{} is on either side of {}", gfr_words(),
                           gfr_.limit_words(settings_.gfr_reduced_below.value));
    }

    /// @returns whether the gap is high
    Answer corrected_gap() {
        const double normal_to = settings_.gap_normal_to.value;
        const double high_from = settings_.gap_high_from.value;
        const auto what = [this](double limit) {
            return fmt::format("anion gap corrected for albumin {}", corrected_.words_beside(limit));
        };
        if (corrected_.below(low_gap) == Answer::yes) {
            remark_low_gap([&] { return what(low_gap); }, "lithium");
        } else if (corrected_.above(normal_to) == Answer::no) {
            say(GateStatus::in_scope,
                [&] { return fmt::format("{} is normal, not above {}", what(normal_to), mmol(normal_to)); });
        } else if (corrected_.above(high_from) == Answer::yes) {
            high_gap([&] { return fmt::format("{} is above {}", what(high_from), mmol(high_from)); });
        } else {
            between_limits([&] {
                return corrected_.above(normal_to) == Answer::yes
                           ? fmt::format("{} is above {} but not clearly above {}", what(normal_to),
                                         mmol(normal_to), mmol(high_from))
                           : fmt::format(
                                 "{} lies on either side of {}", what(normal_to),
                                 mmol(corrected_.above(high_from) == Answer::no ? normal_to : high_from));
            });
        }
        return corrected_.above(high_from);
    }

    template <class Words>
    void between_limits(const Words& finding) {
        if (gfr_is_reduced() == Answer::yes) {
            say(GateStatus::in_scope, [&] {
                return fmt::format("{}; {}, which may account for it", finding(), reduced_gfr_words());
            });
        } else if (gfr_is_reduced() == Answer::unknown && gfr_) {
            say(GateStatus::caution, [&] {
                return fmt::format("{}: a normal gap was not confirmed, and {}", finding(),
                                   unknown_gfr_words());
            });
        } else {
            say(GateStatus::caution, [&] { return finding() + ": a normal gap was not confirmed"; });
        }
    }

    template <class Words>
    void high_gap(const Words& finding) {
        switch (gfr_is_reduced()) {
            case Answer::yes:
                say(GateStatus::caution, [&] {
                    return fmt::format("{}; {}: renal failure is among the causes, but {} must be excluded",
                                       finding(), reduced_gfr_words(), acids_to_exclude());
                });
                return;
            case Answer::no:
                say(GateStatus::out_of_scope, [&] {
                    return fmt::format(
                        "{} and {} is not reduced: a high-gap acidosis (lactate, ketones, toxins), "
                        "which these tables do not weigh",
                        finding(), gfr_words());
                });
                return;
            case Answer::unknown:
                say(GateStatus::caution, [&] {
                    return fmt::format("{} and {}: {} must be excluded", finding(), unknown_gfr_words(),
                                       acids_to_exclude());
                });
                return;
        }
    }

    /// Albumin is unknown. A low one would hide a raised gap, a high one feign it: a gap within that doubt of
    /// a limit is a caution, one that is clear of it is read as it stands. @returns whether the gap is high
    Answer uncorrected_gap() {
        const double normal_to = settings_.gap_normal_to.value;
        const double high_from = settings_.gap_high_from.value;
        const double doubt = settings_.chemistry.albumin_slope * albumin_doubt;
        const auto what = [this](double limit) {
            return fmt::format("anion gap {}, not corrected since albumin is not known,",
                               gap_.words_beside(limit));
        };
        if (gap_.below(low_gap) == Answer::yes) {
            remark_low_gap([&] { return what(low_gap); }, "a low albumin, lithium");
            return Answer::no;
        }
        if (gap_.above(normal_to - doubt) == Answer::no) {
            say(GateStatus::in_scope, [&] {
                return fmt::format("{} is normal, not above {}; it would be higher if albumin is low",
                                   what(normal_to), mmol(normal_to));
            });
            return Answer::no;
        }
        if (gap_.above(high_from + doubt) == Answer::yes) {
            high_gap([&] { return fmt::format("{} is above {}", what(high_from), mmol(high_from)); });
            return Answer::yes;
        }
        say(GateStatus::caution, [&] {
            return fmt::format("{} lies too near the limits ({} and {}) to be read without albumin",
                               what(high_from), mmol(normal_to), mmol(high_from));
        });
        return Answer::unknown;
    }

    template <class Words>
    void remark_low_gap(const Words& what, std::string_view first) {
        say(GateStatus::caution, [&] {
            return fmt::format(
                "{} is below {}: think of {}, bromide, a paraprotein, or an error of measurement", what(),
                mmol(low_gap), first);
        });
    }

    const GateFacts& facts_;
    const GateSettings& settings_;
    bool in_words_;
    const Known& bicarbonate_;
    const Known& ph_;
    const Known& pco2_;
    const Known& venous_ph_;
    const Known& expected_pco2_;
    const Known& gfr_;
    const Known& gap_;
    const Known& corrected_;
    GateStatus status_ = GateStatus::in_scope;
    bool gas_agrees_ = true;
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
    const GateFacts facts = detail::gate_facts(panel, quantities, settings);
    Examination examination(facts, settings, true);
    GateResult result;
    result.status = examination.run();
    result.reasons = std::move(examination).reasons();
    for (const std::string_view id :
         {"anion_gap", "anion_gap_corrected", "expected_pco2", "delta_ratio", "bicarbonate_from_gas"}) {
        if (const QuantityValue* known = quantities.find(id); known != nullptr && known->value.is_point()) {
            result.quantities.emplace_back(id, known->value.low);
        }
    }
    return result;
}

GateStatus detail::gate_status(const GateFacts& facts, const GateSettings& settings) {
    return Examination(facts, settings, false).run();
}

std::vector<std::string> gate_inputs(const GateSettings& settings) {
    std::vector<std::string> ids(inputs.begin(), inputs.end());
    for (const std::string& feature : {settings.alkali_feature, settings.pregnancy_feature}) {
        if (!feature.empty()) {
            ids.push_back(feature);
        }
    }
    for (const GfrCondition& condition : settings.gfr_conditions) {
        ids.push_back(condition.feature);
    }
    return ids;
}

}  // namespace steelyard::likelihoods
