// SPDX-License-Identifier: Apache-2.0
#pragma once
// Tallies drawn from tables and shares of the causes, so that what an audit must find is known.

#include <cmath>
#include <cstdint>
#include <string>
#include <utility>
#include <vector>

#include "steelyard/cli/tally.hpp"
#include "steelyard/engine/counter_random.hpp"

namespace steelyard::test {

struct DrawnSeries {
    std::uint64_t patients = 1000;
    std::vector<double> shares;  ///< of the causes of the tables, in their order; summing to 1
    std::uint64_t seed = 1;
    /// Exponent on the shares of the bands that findings are drawn from: below 1 they tell less than the
    /// tables say, so that probabilities from the tables are too sure; above 1 the other way round.
    double strength = 1.0;
    double missing = 0.2;      ///< chance that a finding is not known
    double outside = 0.0;      ///< share with a final cause that no table has; their bands are drawn evenly
    double undiagnosed = 0.0;  ///< share without a final cause
    double caution = 0.1;      ///< share that the gate marks
    std::vector<std::string> strata, months;  ///< evenly; empty for none
};

/// Draws with one stream for each patient, so that a longer series begins with the shorter one.
class DrawnPatients {
  public:
    DrawnPatients(const likelihoods::TableSet& tables, const DrawnSeries& series)
        : tables_(tables), series_(series) {
        std::vector<std::string> causes;
        for (const likelihoods::Cause& cause : tables.causes) {
            causes.push_back(cause.id);
        }
        for (const likelihoods::EvidenceTable& table : tables.tables) {
            Eigen::ArrayXXd shares =
                likelihoods::band_probabilities(tables, table, causes).pow(series.strength);
            shares.rowwise() /= shares.colwise().sum().eval();
            shares_.push_back(shares);
        }
    }

    void add(cli::Tally& tally, std::uint64_t patient) {
        draw_ = 0;
        patient_ = patient;
        const auto cause = pick(Eigen::Map<const Eigen::ArrayXd>(
            series_.shares.data(), static_cast<Eigen::Index>(series_.shares.size())));
        const bool outside = next() < series_.outside;
        likelihoods::PatternCode code;
        for (const Eigen::ArrayXXd& shares : shares_) {
            const bool missing = next() < series_.missing;
            const Eigen::Index band =
                pick(outside ? Eigen::ArrayXd(Eigen::ArrayXd::Constant(
                                   shares.rows(), 1.0 / static_cast<double>(shares.rows())))
                             : Eigen::ArrayXd(shares.col(cause)));
            code += static_cast<char>(missing ? likelihoods::missing_state
                                              : likelihoods::first_band_state + band);
        }
        const auto gate =
            next() < series_.caution ? likelihoods::GateStatus::caution : likelihoods::GateStatus::in_scope;
        const bool undiagnosed = next() < series_.undiagnosed;
        const std::string known =
            outside ? "sea_sickness" : tables_.causes[static_cast<std::size_t>(cause)].id;
        tally.add(code, gate, undiagnosed ? "" : known, one_of(series_.strata), one_of(series_.months));
    }

  private:
    double next() { return engine::uniform(series_.seed, static_cast<std::uint32_t>(patient_), draw_++); }
    Eigen::Index pick(const Eigen::ArrayXd& shares) {
        double left = next();
        Eigen::Index at = 0;
        while (at + 1 < shares.size() && (left -= shares(at)) > 0.0) {
            ++at;
        }
        return at;
    }
    std::string one_of(const std::vector<std::string>& words) {
        const double u = next();
        return words.empty() ? "" : words[static_cast<std::size_t>(u * static_cast<double>(words.size()))];
    }

    const likelihoods::TableSet& tables_;
    const DrawnSeries& series_;
    std::vector<Eigen::ArrayXXd> shares_;
    std::uint64_t patient_ = 0, draw_ = 0;
};

inline cli::Tally drawn_tally(const likelihoods::TableSet& tables, const DrawnSeries& series) {
    cli::TallyHead head = cli::tally_head(tables, {}, !series.months.empty());
    if (!series.strata.empty()) {
        head.by = {"ward"};
    }
    cli::Tally tally(head);
    DrawnPatients patients(tables, series);
    for (std::uint64_t patient = 0; patient < series.patients; ++patient) {
        patients.add(tally, patient);
    }
    return tally;
}

}  // namespace steelyard::test
