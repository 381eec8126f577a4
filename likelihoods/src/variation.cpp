// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/variation.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <utility>

#include "band_edges.hpp"
#include "steelyard/engine/domain_error.hpp"
#include "steelyard/likelihoods/table_set.hpp"
#include "wording.hpp"

namespace steelyard::likelihoods {

double VariationFigure::sd_at(double value) const noexcept {
    return relative ? size * std::abs(value) : size;
}

const Variation* VariationSettings::find(std::string_view quantity) const noexcept {
    const auto found = std::find_if(quantities.begin(), quantities.end(),
                                    [&](const Variation& entry) { return entry.quantity == quantity; });
    return found == quantities.end() ? nullptr : &*found;
}

bool follows_urine_dilution(std::string_view quantity) noexcept {
    const Analyte* analyte = find_analyte(quantity);
    if (analyte == nullptr || !analyte->id.starts_with("urine_")) {
        return false;
    }
    const std::span<const Unit> all = units();
    const auto unit =
        std::find_if(all.begin(), all.end(), [&](const Unit& known) { return known.ucum == analyte->unit; });
    return unit != all.end() &&
           (unit->dimension == Dimension::amount_concentration || unit->dimension == Dimension::osmolality);
}

namespace {

std::string title_of(std::string_view quantity) {
    const QuantityKind* kind = find_quantity(quantity);
    return kind == nullptr ? std::string(quantity) : detail::in_sentence(kind->title);
}

/// What one input of a quantity brings to its spread.
struct Input {
    std::string id;
    double value = 0.0;
    double own = 0.0;  ///< standard deviation of what is its own: analytical, and within-subject without the
                       ///< part in common
    double common =
        0.0;  ///< coefficient of variation that it has in common with the urine's other concentrations
};

class SpreadReader {
  public:
    SpreadReader(const TableSet& set, const Panel& panel, const Quantities& quantities)
        : set_(set), panel_(panel), quantities_(quantities) {}

    SpreadResult run(std::string_view quantity) && {
        const QuantityValue* known = quantities_.find(quantity);
        if (known == nullptr) {
            result_.why_not = fmt::format("{} is not known", title_of(quantity));
            return std::move(result_);
        }
        if (!known->value.is_point()) {
            result_.why_not = fmt::format("{} is known only to lie in an interval", title_of(quantity));
            return std::move(result_);
        }
        const bool computed = known->origin == Origin::computed;
        const std::vector<Input> inputs =
            read_inputs(computed ? known->from : std::vector<std::string>{std::string(quantity)});
        if (!result_.not_stated.empty()) {
            std::vector<std::string> titles(result_.not_stated.size());
            std::transform(result_.not_stated.begin(), result_.not_stated.end(), titles.begin(), title_of);
            result_.why_not = fmt::format("no variation is stated for {}", detail::listed_in_words(titles));
            return std::move(result_);
        }
        const std::optional<double> sd =
            computed ? propagated(quantity, *known, inputs)
                     : std::optional<double>(
                           std::hypot(inputs.front().own, inputs.front().common * inputs.front().value));
        if (!sd) {
            result_.why_not =
                fmt::format("the formula of {} has no value close to this one", title_of(quantity));
        } else if (!(*sd > 0.0) || !std::isfinite(*sd)) {
            result_.why_not =
                fmt::format("the variation stated for {} comes to nothing at this value", title_of(quantity));
        } else {
            spread_.sd = *sd;
            spread_.unit = known->unit;
            result_.spread = std::move(spread_);
        }
        return std::move(result_);
    }

  private:
    /// The figures of the quantity with those of a method in their place.
    static VariationParts with_method(VariationParts parts, const VariationParts& method) {
        parts.analytical = method.analytical ? method.analytical : parts.analytical;
        parts.within = method.within ? method.within : parts.within;
        return parts;
    }

    static double spread_at(const VariationParts& parts, double value) {
        return std::hypot(parts.analytical ? parts.analytical->sd_at(value) : 0.0,
                          parts.within ? parts.within->sd_at(value) : 0.0);
    }

    /// The figures of the quantity itself, or of the method that the case states. Where it states none, the
    /// widest: a value must not look surer than it is.
    VariationParts parts_of(const Variation& entry, double value) {
        VariationParts parts = entry.parts;
        const std::string_view method = method_of(panel_, entry.quantity);
        std::string widest;
        for (const MethodVariation& known : entry.methods) {
            const VariationParts by_it = with_method(entry.parts, known.parts);
            if (known.method == method) {
                parts = by_it;
            } else if (method.empty() && spread_at(by_it, value) > spread_at(parts, value)) {
                parts = by_it;
                widest = known.method;
            }
        }
        if (!widest.empty()) {
            spread_.remarks.push_back(
                fmt::format("how {} was measured is not stated: the spread of a {}, the widest, is taken",
                            title_of(entry.quantity), widest));
        }
        if (!parts.within) {
            spread_.remarks.push_back(
                fmt::format("of {} only the analytical part is stated, so the spread is too small",
                            title_of(entry.quantity)));
        } else if (!parts.analytical) {
            spread_.remarks.push_back(
                fmt::format("no analytical part is stated apart for {}", title_of(entry.quantity)));
        }
        return parts;
    }

    void rest_on(const VariationFigure& figure) {
        const document::Grounds& grounds = figure.grounds;
        const bool listed =
            std::any_of(spread_.grounds.begin(), spread_.grounds.end(), [&](const document::Grounds& other) {
                return other.basis == grounds.basis && other.sources == grounds.sources;
            });
        if (!listed) {
            spread_.grounds.push_back(grounds);
        }
        spread_.weakest = std::max(spread_.weakest, grounds.basis);  // ordered from study to memory
    }

    std::vector<Input> read_inputs(const std::vector<std::string>& ids) {
        std::vector<Input> inputs;
        for (const std::string& id : ids) {
            const Variation* entry = set_.variation.find(id);
            if (entry == nullptr) {
                result_.not_stated.push_back(id);
                continue;
            }
            Input input;
            input.id = id;
            input.value = quantities_.find(id)->value.low;
            const VariationParts parts = parts_of(*entry, input.value);
            if (parts.analytical) {
                rest_on(*parts.analytical);
                input.own = parts.analytical->sd_at(input.value);
            }
            if (parts.within) {
                rest_on(*parts.within);
                add_within(*parts.within, input);
            }
            inputs.push_back(std::move(input));
        }
        return inputs;
    }

    void add_within(const VariationFigure& within, Input& input) {
        double own = within.sd_at(input.value);
        if (set_.variation.urine_dilution && follows_urine_dilution(input.id)) {
            rest_on(*set_.variation.urine_dilution);
            input.common = set_.variation.urine_dilution->size;
            const double common = input.common * input.value;
            own = std::sqrt(std::max(0.0, (own - common) * (own + common)));
        }
        input.own = std::hypot(input.own, own);
    }

    Panel moved(const std::vector<std::pair<std::string, double>>& values) const {
        Panel other = panel_;
        for (const auto& [id, value] : values) {
            auto& readings = other.measured.contains(id) ? other.measured : other.given;
            readings.find(id)->second.value = Interval::point(value);
        }
        return other;
    }

    /// The quantity on a moved panel; empty when it has no value there, or is no longer computed in the same
    /// way.
    std::optional<double> value_on(std::string_view quantity, const QuantityValue& known,
                                   const Panel& other) const {
        const Quantities quantities = derive(other, set_.gate.chemistry);
        const QuantityValue* found = quantities.find(quantity);
        if (found == nullptr || !found->value.is_point() || found->from != known.from) {
            return std::nullopt;
        }
        return found->value.low;
    }

    /// By how much the quantity changes for one standard deviation of some inputs moved together. @param
    /// steps  their standard deviations
    std::optional<double> change(std::string_view quantity, const QuantityValue& known,
                                 const std::vector<Input>& inputs, const std::vector<double>& steps) const {
        constexpr int halvings = 10;
        for (int i = 0; i <= halvings; ++i) {
            const double part = std::ldexp(1.0, -i);
            std::vector<std::pair<std::string, double>> up, down;
            for (std::size_t k = 0; k < inputs.size(); ++k) {
                up.emplace_back(inputs[k].id, inputs[k].value + part * steps[k]);
                down.emplace_back(inputs[k].id, inputs[k].value - part * steps[k]);
            }
            const std::optional<double> above = value_on(quantity, known, moved(up));
            const std::optional<double> below = value_on(quantity, known, moved(down));
            if (above && below) {
                return (*above - *below) / (2.0 * part);
            }
        }
        return std::nullopt;
    }

    std::optional<double> propagated(std::string_view quantity, const QuantityValue& known,
                                     const std::vector<Input>& inputs) {
        double sd = 0.0;
        for (const Input& input : inputs) {
            const std::optional<double> part = change(quantity, known, {input}, {input.own});
            if (!part) {
                return std::nullopt;
            }
            sd = std::hypot(sd, *part);
        }
        std::vector<Input> diluted;
        std::vector<double> steps;
        for (const Input& input : inputs) {
            if (input.common > 0.0) {
                diluted.push_back(input);
                steps.push_back(input.common * input.value);
            }
        }
        if (!diluted.empty()) {
            const std::optional<double> part = change(quantity, known, diluted, steps);
            if (!part) {
                return std::nullopt;
            }
            sd = std::hypot(sd, *part);
        }
        if (inputs.size() > 1) {
            spread_.remarks.emplace_back(
                diluted.empty()
                    ? "the values it is computed from are taken to vary independently"
                    : "the values it is computed from are taken to vary independently but for the dilution "
                      "of the urine");
        }
        return sd;
    }

    const TableSet& set_;
    const Panel& panel_;
    const Quantities& quantities_;
    MeasurementSpread spread_;
    SpreadResult result_;
};

void check_finite(std::string_view function, std::string_view argument, double value) {
    constexpr double infinity = std::numeric_limits<double>::infinity();
    engine::check_between(function, argument, value, -infinity, infinity);
}

}  // namespace

SpreadResult spread_of(const TableSet& set, const Panel& panel, const Quantities& quantities,
                       std::string_view quantity) {
    return SpreadReader(set, panel, quantities).run(quantity);
}

double chance_on_repeat(double value, double edge, double sd) {
    check_finite("chance_on_repeat", "value", value);
    check_finite("chance_on_repeat", "edge", edge);
    engine::check_positive("chance_on_repeat", "sd", sd);
    // Phi(-d / (sqrt(2) sd)) = erfc(d / (2 sd)) / 2.
    return 0.5 * std::erfc(std::abs(value - edge) / (2.0 * sd));
}

NearestEdge nearest_edge(double value, std::span<const double> edges) {
    check_finite("nearest_edge", "value", value);
    if (edges.empty()) {
        throw engine::DomainError("nearest_edge", "edges size", std::nullopt, std::nullopt, 0.0,
                                  "at least 1");
    }
    for (std::size_t i = 0; i < edges.size(); ++i) {
        if (!std::isfinite(edges[i]) || (i > 0 && !(edges[i - 1] < edges[i]))) {
            throw engine::DomainError("nearest_edge", "edges", static_cast<Eigen::Index>(i), std::nullopt,
                                      edges[i], "finite and above the edge before it");
        }
    }
    const auto nearest = std::min_element(edges.begin(), edges.end(), [&](double a, double b) {
        return std::abs(a - value) < std::abs(b - value);
    });
    const auto index = static_cast<Eigen::Index>(nearest - edges.begin());
    const bool on_edge = std::abs(value - *nearest) <= detail::edge_tolerance(*nearest);
    const bool in_upper = detail::at_or_above(value, *nearest);
    return {*nearest, on_edge ? 0.0 : *nearest - value, in_upper ? index : index + 1};
}

}  // namespace steelyard::likelihoods
