// SPDX-License-Identifier: Apache-2.0
// How far readings scatter: `variation` of set.yaml. The laboratory's part and the patient's own come from
// different places, so each figure has its own basis and source.
#include <fmt/format.h>

#include "quantity_text.hpp"
#include "read_set_file.hpp"

namespace steelyard::likelihoods::detail {

using document::Code;
using document::Diagnostics;
using document::Entry;
using document::Node;
using document::StrictMap;

namespace {

constexpr std::string_view dilution_key = "urine_dilution";

/// The forms in which a figure may be given.
enum class Form { percentage_or_sd, percentage, sd };

bool is_percentage(const Node& value) {
    return value.kind == document::Kind::scalar &&
           value.text.find_last_not_of(" \t%") != value.text.find_last_not_of(" \t");
}

/// A size above 0; out_of_range at the node otherwise.
std::optional<double> read_size(const Node& node, const std::string& what, const QuantityRange& range,
                                Diagnostics& faults) {
    const std::optional<double> size = read_quantity(node, what, range, faults);
    if (size && *size == 0.0) {
        faults.add(node.where(), Code::out_of_range, fmt::format("{} is 0, but must be above it", what),
                   "leave the entry out when the variation is not known");
        return std::nullopt;
    }
    return size;
}

/// One figure: `{value, basis, source, note}`. @param quantity  what it is a figure of
std::optional<VariationFigure> read_figure(const Node& node, const std::string& what,
                                           const QuantityRange& quantity, Form form,
                                           const document::Sources& sources, Diagnostics& faults) {
    StrictMap map(node, what, faults);
    const Node* value = map.required("value");
    std::optional<document::Grounds> grounds;
    if (map.usable()) {
        grounds = document::read_grounds(map, sources, true, faults);
    }
    VariationFigure figure;
    figure.note = map.optional_text("note").value_or("");
    map.finish();
    if (value == nullptr) {
        return std::nullopt;
    }
    figure.relative = is_percentage(*value);
    figure.as_given = value->text;
    if (figure.relative && form == Form::sd) {
        faults.add(
            value->where(), Code::bad_variation,
            fmt::format("{}: a percentage of {} has no meaning, because its zero is arbitrary or it may "
                        "be zero",
                        map.name("value"), quantity.title),
            fmt::format("write the standard deviation in {}", quantity.unit));
        return std::nullopt;
    }
    if (!figure.relative && form == Form::percentage && value->kind == document::Kind::scalar) {
        faults.add(value->where(), Code::bad_variation,
                   fmt::format("{} must be a percentage, so that what all concentrations of a urine have in "
                               "common can be parted from it",
                               map.name("value")),
                   "write the coefficient of variation, as in: 25 %");
        return std::nullopt;
    }
    const std::string title = fmt::format("a variation of {}", quantity.title);
    const QuantityRange range =
        figure.relative
            ? QuantityRange{"a coefficient of variation", "%", {}, 0.0, 100.0}
            : QuantityRange{title, quantity.unit, quantity.substance, 0.0, quantity.high - quantity.low};
    const std::optional<double> size = read_size(*value, map.name("value"), range, faults);
    if (!size || !grounds) {
        return std::nullopt;
    }
    figure.size = figure.relative ? *size / 100.0 : *size;
    figure.grounds = std::move(*grounds);
    return figure;
}

/// Reads the entries; `urine_dilution` is read before them, because it bounds some.
class VariationReader {
  public:
    VariationReader(TableSet& set, Diagnostics& faults) : set_(set), faults_(faults) {}

    void read(const Node& node) {
        if (const Node* dilution = node.kind == document::Kind::mapping ? node.find(dilution_key) : nullptr) {
            set_.variation.urine_dilution =
                read_figure(*dilution, fmt::format("variation.{}", dilution_key),
                            {"urine", "%", {}, 0.0, 0.0}, Form::percentage, set_.sources, faults_);
        }
        for (const Entry& entry : entries_of(node, "variation", faults_)) {
            if (entry.key != dilution_key && check_key(entry, "variation", faults_)) {
                read_entry(entry);
            }
        }
    }

  private:
    void read_entry(const Entry& entry) {
        const std::optional<QuantityRange> range = describe_quantity(entry.key);
        if (!range) {
            std::vector<std::string> known = quantity_ids();
            known.emplace_back(dilution_key);
            faults_.add(where_of(entry), Code::unknown_quantity,
                        fmt::format("variation: {} is no quantity this program knows", entry.key),
                        name_hint(entry.key, known));
            return;
        }
        StrictMap map(entry.value, "variation." + entry.key, faults_);
        Variation variation;
        variation.quantity = entry.key;
        variation.parts = read_parts(map, entry.value, entry.key, *range);
        if (const Node* methods = map.optional("methods")) {
            read_methods(*methods, map.name("methods"), *range, variation);
        }
        map.finish();
        set_.variation.quantities.push_back(std::move(variation));
    }

    void read_methods(const Node& node, const std::string& what, const QuantityRange& range,
                      Variation& variation) {
        const std::span<const std::string> known = methods_of(variation.quantity);
        for (const Entry& entry : entries_of(node, what, faults_)) {
            if (!contains(known, entry.key)) {
                faults_.add(where_of(entry), Code::bad_choice,
                            fmt::format("{}: a case cannot state \"{}\" as the method of {}", what, entry.key,
                                        variation.quantity),
                            name_hint(entry.key, known));
                continue;
            }
            StrictMap map(entry.value, what + "." + entry.key, faults_);
            variation.methods.push_back({entry.key, read_parts(map, entry.value, variation.quantity, range)});
            map.finish();
        }
    }

    VariationParts read_parts(StrictMap& map, const Node& node, const std::string& quantity,
                              const QuantityRange& range) {
        const Node* analytical = map.optional("analytical");
        const Node* within = map.optional("within");
        if (map.usable() && analytical == nullptr && within == nullptr &&
            node.find("analytical") == nullptr && node.find("within") == nullptr) {
            faults_.add(node.where(), Code::missing_key,
                        fmt::format("{} needs `analytical`, `within` or both", map.what()));
        }
        // A pH counts from an arbitrary zero and a gap may be zero: neither has a coefficient of variation.
        const std::optional<Unit> unit = read_unit(range.unit).unit;
        const bool has_percentage = range.low >= 0.0 && !(unit && unit->dimension == Dimension::ph);
        const Form form = has_percentage ? Form::percentage_or_sd : Form::sd;
        const bool diluted = set_.variation.urine_dilution && follows_urine_dilution(quantity);
        VariationParts parts;
        if (analytical != nullptr) {
            parts.analytical =
                read_figure(*analytical, map.name("analytical"), range, form, set_.sources, faults_);
        }
        if (within != nullptr) {
            parts.within = read_figure(*within, map.name("within"), range, diluted ? Form::percentage : form,
                                       set_.sources, faults_);
        }
        if (diluted && parts.within && parts.within->size < set_.variation.urine_dilution->size) {
            faults_.add(
                within->find("value")->where(), Code::bad_variation,
                fmt::format("{} is {}, less than the {} of {} that all concentrations of a urine have "
                            "in common",
                            map.name("within"), parts.within->as_given,
                            set_.variation.urine_dilution->as_given, dilution_key),
                "give the whole variation of the concentration, dilution included");
        }
        return parts;
    }

    TableSet& set_;
    Diagnostics& faults_;
};

}  // namespace

void read_variation(const Node& node, TableSet& set, Diagnostics& faults) {
    VariationReader(set, faults).read(node);
}

}  // namespace steelyard::likelihoods::detail
