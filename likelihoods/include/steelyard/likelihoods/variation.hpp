// SPDX-License-Identifier: Apache-2.0
#pragma once
// How far one reading lies from a patient's usual level: the laboratory's scatter (analytical variation) and
// the patient's own (within-subject variation), as a table set states them under `variation`, and what they
// mean beside a band edge.

#include <Eigen/Core>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/sources.hpp"
#include "steelyard/likelihoods/derived.hpp"

namespace steelyard::likelihoods {

struct TableSet;

/// One stated figure: a coefficient of variation, or a standard deviation.
struct VariationFigure {
    double size = 0.0;      ///< a fraction of the value when relative, else in the canonical unit; > 0
    bool relative = false;  ///< a coefficient of variation
    std::string as_given;   ///< `4 %`, `0.9 mmHg`
    document::Grounds grounds;
    std::string note;  ///< may be empty

    /// The standard deviation at a value, in its canonical unit.
    double sd_at(double value) const noexcept;
};

/// The variation of one quantity by one way of measuring it. One of the two parts may be absent, not both.
struct VariationParts {
    std::optional<VariationFigure> analytical;
    /// Of a concentration in urine this is the whole of it, the dilution of the urine included.
    std::optional<VariationFigure> within;
};

struct MethodVariation {
    std::string method;    ///< one that a case may state: `dipstick`
    VariationParts parts;  ///< in place of the quantity's own; a part that is absent here is the quantity's
};

struct Variation {
    std::string quantity;  ///< analyte or derived quantity
    VariationParts parts;
    std::vector<MethodVariation> methods;
};

/// `variation` of set.yaml; empty where the set states none.
struct VariationSettings {
    std::vector<Variation> quantities;  ///< in the order of the file
    /// The part of the variation that all concentrations of one urine have in common, because the urine is
    /// more or less dilute; a coefficient of variation.
    std::optional<VariationFigure> urine_dilution;

    const Variation* find(std::string_view quantity) const noexcept;
};

/// Whether a quantity is a concentration (or the osmolality) of a urine sample, so that the dilution of the
/// urine moves it: not the pH, the pCO2 or what a day's urine holds.
bool follows_urine_dilution(std::string_view quantity) noexcept;

/// The spread of single readings of one patient in a steady state.
struct MeasurementSpread {
    double sd = 0.0;                         ///< both parts together [unit]; > 0
    std::string_view unit;                   ///< canonical, UCUM
    std::vector<document::Grounds> grounds;  ///< what it rests on: those of the figures used, each once
    document::Basis weakest{};               ///< the weakest basis among them
    std::vector<std::string> remarks;        ///< what a reader should know, in words; may be empty
};

/// A spread, or why there is none.
struct SpreadResult {
    std::optional<MeasurementSpread> spread;
    std::vector<std::string> not_stated;  ///< quantities for which the set states no variation
    std::string why_not;                  ///< in words; empty when there is a spread
};

/// The standard deviation of one reading of a quantity about the patient's usual level.
///
/// A measured quantity: sqrt(analytical^2 + within^2) by the set's figures, those of the method of
/// measurement where the case states one. A value given in the case for a derived quantity: the same by the
/// entry of that quantity. A computed quantity: each input is moved by one standard deviation up and down and
/// derive() is repeated; half the difference is that input's part, and the parts add in quadrature (law of
/// propagation of uncertainty for independent inputs; BIPM, Evaluation of measurement data, JCGM
/// 100:2008, 5.1.2, from memory). The step is one standard deviation rather than a small one, so that a
/// formula which bends or steps near the value (GFR, TmP/GFR) counts by what it does there; where the formula
/// has no value so far away the step is halved. The part of the variation that all concentrations of one
/// urine have in common is moved in all of them at once, so that it cancels in ratios and scales gaps; what
/// remains of each, sqrt(within^2 - common^2), is its own. Apart from that the inputs are taken as
/// independent. They are not quite (sodium and chloride rise together, a urine's salt and urea are in its
/// osmolality), so the spread of a gap is rather too wide than too narrow.
///
/// @param set         gives the figures and the coefficients of the formulas
/// @param panel       the case
/// @param quantities  derive(panel, set.gate.chemistry)
/// @param quantity    id of an analyte or derived quantity
/// @returns           no spread for what is not known, known only as an interval, or rests on an input for
///                    which the set states no variation
SpreadResult spread_of(const TableSet& set, const Panel& panel, const Quantities& quantities,
                       std::string_view quantity);

/// The chance that a repeat sample lies on the other side of an edge, Phi(-|value - edge| / (sqrt(2) sd)):
/// the difference of two readings of one patient in a steady state is normal with standard deviation sqrt(2)
/// sd (the reference change value of Harris and Yasaka, Clin Chem 1983;29:25-30, citation and formula from
/// memory). 1/2 on the edge, and never more. Illness and its treatment move values by more than this.
///
/// @param value  finite @param edge  finite, in the same unit @param sd  finite, > 0, in the same unit
/// @throws engine::DomainError
double chance_on_repeat(double value, double edge, double sd);

struct NearestEdge {
    double edge = 0.0;
    double distance = 0.0;         ///< edge - value: what the value would have to rise by; 0 on the edge
    Eigen::Index band_beyond = 0;  ///< the band on the other side of the edge
};

/// The band edge nearest to a value. A value on an edge lies in the band above it: then the edge is that one,
/// the distance 0 and the band beyond the lower one. Of two edges equally near it is the lower.
///
/// @param value  finite @param edges  increasing, at least one; n edges make the bands 0 to n
/// @throws engine::DomainError
NearestEdge nearest_edge(double value, std::span<const double> edges);

}  // namespace steelyard::likelihoods
