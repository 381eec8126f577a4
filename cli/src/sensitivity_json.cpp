// SPDX-License-Identifier: Apache-2.0
#include "sensitivity_json.hpp"

#include <cmath>

namespace steelyard::cli {
namespace {

using Json = nlohmann::ordered_json;

Json by_cause(const Weighing& weighing, const PerCause& values) {
    Json object = Json::object();
    for (std::size_t k = 0; k < values.size(); ++k) {
        object[weighing.causes[k].id] = values[k];
    }
    return object;
}

/// JSON has no infinity: what leaves the range of a double is null.
Json finite(double value) {
    return std::isfinite(value) ? Json(value) : Json(nullptr);
}

Json without_json(const Weighing& weighing, const Sensitivity& sensitivity) {
    Json list = Json::array();
    for (const WithoutFinding& without : sensitivity.without) {
        list.push_back({{"finding", without.finding},
                        {"leader", weighing.causes[without.leader].id},
                        {"posterior", by_cause(weighing, without.posterior)}});
    }
    return list;
}

Json rows_json(const Weighing& weighing, const Sensitivity& sensitivity) {
    Json list = Json::array();
    for (const RowFactor& row : sensitivity.rows) {
        Json causes = Json::array();
        for (const std::size_t cause : row.causes) {
            causes.push_back(weighing.causes[cause].id);
        }
        list.push_back({{"finding", row.finding},
                        {"cause", causes.front()},
                        {"factor", finite(row.factor)},
                        {"within_interval", row.inside},
                        {"taken_by", causes},
                        {"rival", weighing.causes[row.rival].id},
                        {"interval", {row.low, finite(row.high)}},
                        {"share_possible", row.possible}});
    }
    return list;
}

Json edges_json(const Weighing& weighing, const Sensitivity& sensitivity) {
    Json list = Json::array();
    for (const ValueEdge& edge : sensitivity.edges) {
        list.push_back(
            {{"finding", edge.finding},
             {"edge", edge.nearest.edge},
             {"distance", edge.nearest.distance},
             {"leader_beyond", weighing.causes[edge.leader].id},
             {"posterior_beyond", by_cause(weighing, edge.posterior)},
             {"chance_on_repeat", edge.chance ? Json(*edge.chance) : Json(nullptr)},
             {"chance_of_another_leader", edge.chance_other ? Json(*edge.chance_other) : Json(nullptr)},
             {"value", edge.value},
             {"band_beyond", edge.band},
             {"why_no_chance", edge.chance ? Json(nullptr) : Json(edge.why_no_chance)},
             {"basis", edge.weakest ? Json(document::to_string(*edge.weakest)) : Json(nullptr)},
             {"remarks", edge.remarks}});
    }
    return list;
}

Json ranges_json(const Weighing& weighing, const std::vector<CauseRange>& ranges) {
    Json list = Json::array();
    for (const CauseRange& range : ranges) {
        list.push_back(
            {{"cause", weighing.causes[range.cause].id}, {"low", range.low}, {"high", range.high}});
    }
    return list;
}

Json sweeps_json(const Weighing& weighing, const Sensitivity& sensitivity) {
    Json list = Json::array();
    for (const PriorSweep& sweep : sensitivity.sweeps) {
        Json points = Json::array();
        for (std::size_t i = 0; i < sweep.priors.size(); ++i) {
            points.push_back(
                {{"prior", sweep.priors[i]}, {"posterior", by_cause(weighing, sweep.posterior[i])}});
        }
        list.push_back({{"cause", weighing.causes[sweep.cause].id}, {"points", points}});
    }
    return list;
}

}  // namespace

void add_intervals(const Sensitivity& sensitivity, Json& causes) {
    const engine::PosteriorSpread& spread = sensitivity.spread;
    for (std::size_t k = 0; k < causes.size(); ++k) {
        const auto at = static_cast<Eigen::Index>(k);
        causes[k]["low"] = spread.low(at);
        causes[k]["high"] = spread.high(at);
        causes[k]["leads"] = spread.leads(at);
        causes[k]["low_error"] = spread.low_error(at);
        causes[k]["high_error"] = spread.high_error(at);
        causes[k]["leads_error"] = spread.leads_error(at);
    }
}

Json sensitivity_json(const Weighing& weighing, const Sensitivity& sensitivity) {
    Json json = Json::object();
    json["without"] = without_json(weighing, sensitivity);
    json["tipping_priors"] = Json::array();
    for (const Tipping& tipping : sensitivity.tipping) {
        json["tipping_priors"].push_back({{"rival", weighing.causes[tipping.rival].id},
                                          {"prior", tipping.prior},
                                          {"odds_factor", finite(tipping.odds_factor)}});
    }
    if (sensitivity.until) {
        json["until"] = {
            {"cause", weighing.causes[weighing.ranking[0]].id},
            {"posterior", sensitivity.until->target},
            {"prior", sensitivity.until->prior ? Json(*sensitivity.until->prior) : Json(nullptr)}};
    }
    json["sweeps"] = sweeps_json(weighing, sensitivity);
    json["rows"] = rows_json(weighing, sensitivity);
    json["edges"] = edges_json(weighing, sensitivity);
    json["range"] = ranges_json(weighing, sensitivity.range);
    json["range_narrowed"] = sensitivity.range_narrowed;
    if (sensitivity.epsilon) {
        json["contamination"] = {{"epsilon", *sensitivity.epsilon},
                                 {"range", ranges_json(weighing, sensitivity.contamination)}};
    }
    json["variance"] = Json::array();
    for (const VarianceSource& source : sensitivity.variance) {
        json["variance"].push_back({{"source", source.source},
                                    {"first", source.first},
                                    {"total", source.total},
                                    {"first_error", source.first_error},
                                    {"total_error", source.total_error}});
    }
    return json;
}

Json fit_json(const Weighing& weighing, const Fit& fit) {
    Json causes = Json::array();
    for (std::size_t k = 0; k < fit.surprise.size(); ++k) {
        causes.push_back({{"id", weighing.causes[k].id},
                          {"surprise", fit.surprise[k]},
                          {"surprise_error", fit.surprise_error[k]}});
    }
    return {{"conflict_bits", fit.conflict_bits},
            {"causes", causes},
            {"explained", fit.explained},
            {"exact", fit.exact}};
}

Json next_json(const Weighing& weighing, const likelihoods::TableSet& tables,
               const Sensitivity& sensitivity) {
    Json list = Json::array();
    for (const NextTest& test : sensitivity.next) {
        const likelihoods::EvidenceTable& table = *tables.find_table(test.finding);
        Json after = Json::array();
        for (const AfterBand& band : test.after) {
            after.push_back({{"band", band.band},
                             {"probability", band.probability},
                             {"posterior", by_cause(weighing, band.posterior)}});
        }
        list.push_back({{"finding", test.finding},
                        {"bits", test.bits},
                        {"leader_changes", test.leader_changes},
                        {"burden", table.burden},
                        {"caution", table.caution.empty() ? Json(nullptr) : Json(table.caution)},
                        {"after", after}});
    }
    return list;
}

Json next_pair_json(const Sensitivity& sensitivity) {
    if (!sensitivity.pair) {
        return nullptr;
    }
    Json json = {{"together",
                  {{"findings", {sensitivity.pair->first, sensitivity.pair->second}},
                   {"bits", sensitivity.pair->bits}}}};
    json["in_turn"] = nullptr;
    if (sensitivity.plan) {
        Json second = Json::array();
        for (const std::string& finding : sensitivity.plan->second) {
            second.push_back(finding.empty() ? Json(nullptr) : Json(finding));  // null: stop after the first
        }
        json["in_turn"] = {
            {"first", sensitivity.plan->first}, {"bits", sensitivity.plan->bits}, {"second", second}};
    }
    return json;
}

}  // namespace steelyard::cli
