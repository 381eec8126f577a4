// SPDX-License-Identifier: Apache-2.0
// The posterior over causes x findings, beside a naive peer in long double in the same run: no compensation,
// no checks.

#include <benchmark/benchmark.h>

#include <cmath>
#include <cstdint>
#include <vector>

#include "steelyard/engine/ledger.hpp"
#include "steelyard/engine/posterior.hpp"

namespace {

struct Problem {
    Eigen::ArrayXd log_prior;
    Eigen::ArrayXXd loglik;
    Eigen::ArrayXd weight;
};

/// Reproducible numbers (a 64-bit linear congruential sequence, Knuth's MMIX constants; from memory).
class Numbers {
  public:
    double next() {
        state_ = state_ * 6364136223846793005ULL + 1442695040888963407ULL;
        return (static_cast<double>(state_ >> 11U) + 0.5) * 0x1p-53;
    }

  private:
    std::uint64_t state_ = 20260101;
};

Problem problem(Eigen::Index causes, Eigen::Index findings) {
    Numbers numbers;
    Problem p;
    p.log_prior = Eigen::ArrayXd::NullaryExpr(causes, [&] { return std::log(numbers.next()); });
    p.loglik = Eigen::ArrayXXd::NullaryExpr(findings, causes, [&] { return 0.5 * std::log(numbers.next()); });
    p.weight =
        Eigen::ArrayXd::NullaryExpr(findings, [&] { return numbers.next() < 0.7 ? 1.0 : numbers.next(); });
    return p;
}

void count(benchmark::State& state) {
    state.SetItemsProcessed(state.iterations() * state.range(0) * state.range(1));
    state.SetLabel("items are causes x findings");
}

void posterior(benchmark::State& state) {
    const Problem p = problem(state.range(0), state.range(1));
    for (auto _ : state) {
        Eigen::ArrayXd result = steelyard::engine::posterior(p.log_prior, p.loglik, p.weight);
        benchmark::DoNotOptimize(result.data());
    }
    count(state);
}

void ledger(benchmark::State& state) {
    const Problem p = problem(state.range(0), state.range(1));
    for (auto _ : state) {
        steelyard::engine::Ledger result = steelyard::engine::ledger(p.log_prior, p.loglik, p.weight);
        benchmark::DoNotOptimize(result.log_posterior.data());
    }
    count(state);
}

void naive_long_double(benchmark::State& state) {
    const Problem p = problem(state.range(0), state.range(1));
    for (auto _ : state) {
        std::vector<long double> term(static_cast<std::size_t>(p.log_prior.size()));
        long double sum = 0.0L;
        for (Eigen::Index k = 0; k < p.log_prior.size(); ++k) {
            long double score = p.log_prior(k);
            for (Eigen::Index f = 0; f < p.weight.size(); ++f) {
                score += static_cast<long double>(p.weight(f)) * p.loglik(f, k);
            }
            term[static_cast<std::size_t>(k)] = std::exp(score);
            sum += term[static_cast<std::size_t>(k)];
        }
        for (long double& share : term) {
            share /= sum;
        }
        benchmark::DoNotOptimize(term.data());
    }
    count(state);
}

void sizes(benchmark::internal::Benchmark* bench) {
    bench->ArgNames({"causes", "findings"});
    for (const int causes : {2, 6, 12}) {
        for (const int findings : {5, 30, 100}) {
            bench->Args({causes, findings});
        }
    }
}

BENCHMARK(posterior)->Apply(sizes);
BENCHMARK(ledger)->Apply(sizes);
BENCHMARK(naive_long_double)->Apply(sizes);

}  // namespace

BENCHMARK_MAIN();
