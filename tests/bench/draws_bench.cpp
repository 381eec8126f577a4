// SPDX-License-Identifier: Apache-2.0
// Posteriors drawn a second, and numpy making the same draws in the same run.
//
// usage: draws_bench DRAWS PYTHON PEER_SCRIPT
// The problem: 6 causes, 12 findings of 5 bands, counts of 5 to 15 patients a band, priors known. Both draw,
// for each row, the share of the band that was seen from its Beta law, add up logarithms, take the softmax,
// and give 95 % intervals and how often each cause leads. The peer prints its intervals too, so that one can
// see that it did the same.
#include <chrono>
#include <cstdio>
#include <cstdlib>
#include <string>

#include "steelyard/engine/posterior_spread.hpp"

namespace {

using steelyard::engine::DirichletLaw;
using steelyard::engine::PosteriorSpread;
using steelyard::engine::SummaryLaw;
using steelyard::engine::UncertainPosterior;
using steelyard::engine::UncertainProblem;

constexpr Eigen::Index bands = 5;

struct Size {
    Eigen::Index causes, findings;
};
constexpr Size of_the_peer = {6, 12};

Eigen::ArrayXd alpha_of(Eigen::Index finding, Eigen::Index cause) {
    Eigen::ArrayXd alpha(bands);
    for (Eigen::Index band = 0; band < bands; ++band) {
        alpha(band) = 5.5 + static_cast<double>((7 * finding + 3 * cause + 5 * band) % 11);
    }
    return alpha;
}

/// @param summaries  rows given as mean and spread instead of counts
UncertainProblem problem(const Size& size, bool summaries) {
    const auto [causes, findings] = size;
    UncertainProblem result;
    result.priors.resize(static_cast<std::size_t>(causes));
    result.row_of.resize(findings, causes);
    result.weight.setOnes(findings);
    for (Eigen::Index f = 0; f < findings; ++f) {
        for (Eigen::Index k = 0; k < causes; ++k) {
            const auto row = static_cast<int>(result.rows.size());
            result.row_of(f, k) = row;
            steelyard::engine::UncertainRow added;
            if (summaries) {
                added.law = SummaryLaw{static_cast<double>((f + 2 * k) % 5), 1.5, 12.0,
                                       steelyard::engine::Scale::linear,
                                       Eigen::ArrayXd::LinSpaced(bands - 1, 0.5, 3.5)};
            } else {
                added.law = DirichletLaw{alpha_of(f, k)};
            }
            added.cells = {f % bands};
            added.stream = static_cast<std::uint32_t>(row);
            result.rows.push_back(added);
        }
    }
    return result;
}

void run(const char* name, const UncertainProblem& problem, Eigen::Index draws, int threads) {
    steelyard::engine::SpreadOptions options;
    options.draws = draws;
    options.threads = threads;
    const auto start = std::chrono::steady_clock::now();
    const UncertainPosterior prepared(problem);
    const auto ready = std::chrono::steady_clock::now();
    const PosteriorSpread spread = posterior_spread(prepared, options);
    const auto end = std::chrono::steady_clock::now();
    const std::chrono::duration<double, std::milli> whole = end - start;
    const std::chrono::duration<double, std::milli> preparing = ready - start;
    std::printf("%-10s %d thread%s %8.1f ms (tables %.1f ms)  %8.0f draws/ms  cause 0: %.4f to %.4f\n", name,
                threads, threads == 1 ? " " : "s", whole.count(), preparing.count(),
                static_cast<double>(draws) / whole.count(), spread.low(0), spread.high(0));
}

}  // namespace

int main(int argc, char** argv) {
    if (argc != 4) {
        std::fprintf(stderr, "usage: draws_bench DRAWS PYTHON PEER_SCRIPT\n");
        return 2;
    }
    const Eigen::Index draws = std::atol(argv[1]);
    for (const int threads : {1, 2}) {
        run("counts", problem(of_the_peer, false), draws, threads);
        run("summaries", problem(of_the_peer, true), draws, threads);
    }
    std::printf("growth, one thread, rows of means and spreads:\n");
    for (const Size size : {Size{2, 5}, Size{6, 5}, Size{6, 12}, Size{12, 12}, Size{12, 30}}) {
        std::printf("%2ld causes %2ld findings  ", static_cast<long>(size.causes),
                    static_cast<long>(size.findings));
        run("", problem(size, true), draws, 1);
    }
    std::fflush(stdout);
    const std::string peer = std::string(argv[2]) + " " + argv[3] + " " + argv[1];
    return std::system(peer.c_str()) == 0 ? 0 : 1;  // NOLINT: a bench, run by hand
}
