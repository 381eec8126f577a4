// SPDX-License-Identifier: Apache-2.0
// Bootstrap intervals of an audit from its tally, and numpy resampling the same patients in the same run.
//
// usage: audit_bench PATIENTS REPLICATES PYTHON PEER_SCRIPT PEER_REPLICATES
// The tally: 6 causes, 1,700 patterns, about PATIENTS patients. Ours gives intervals of everything that
// audit_intervals() offers; the peer only of log score, Brier score, top-1 and the area under the curve of
// each cause. The peer runs PEER_REPLICATES replicates on rows, one per patient, and prints its time for
// each; it also does the same on the tally. Both print an interval, so that one can see that they did the
// same.
#include <chrono>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <string>

#include "steelyard/engine/audit.hpp"

namespace {

using steelyard::engine::AuditIntervals;
using steelyard::engine::AuditSample;

constexpr Eigen::Index patterns = 1700;
constexpr Eigen::Index causes = 6;

AuditSample tally(double patients) {
    AuditSample sample{Eigen::ArrayXXd(patterns, causes), Eigen::ArrayXXd(patterns, causes)};
    for (Eigen::Index g = 0; g < patterns; ++g) {
        for (Eigen::Index k = 0; k < causes; ++k) {
            sample.log_forecast(g, k) = static_cast<double>((7 * g + 13 * k + g * k) % 101) / 25.0;
        }
        sample.log_forecast.row(g) -= std::log(sample.log_forecast.row(g).exp().sum());
        const double here = static_cast<double>(1 + g % 7) * patients / (4.0 * static_cast<double>(patterns));
        sample.count.row(g) = (here * (0.7 * sample.log_forecast.row(g).exp() + 0.05)).round();
    }
    return sample;
}

}  // namespace

int main(int argc, char** argv) {
    if (argc != 6) {
        std::fprintf(stderr, "usage: audit_bench PATIENTS REPLICATES PYTHON PEER_SCRIPT PEER_REPLICATES\n");
        return 2;
    }
    const AuditSample sample = tally(std::atof(argv[1]));
    std::printf("%.0f patients, %ld cells\n", sample.patients(),
                static_cast<long>((sample.count > 0.0).count()));
    for (const int threads : {1, 2}) {
        steelyard::engine::ResamplingOptions options;
        options.replicates = std::atol(argv[2]);
        options.threads = threads;
        const auto start = std::chrono::steady_clock::now();
        const AuditIntervals got = audit_intervals(sample, options);
        const std::chrono::duration<double, std::milli> took = std::chrono::steady_clock::now() - start;
        std::printf(
            "%d thread%s %9.1f ms  %9.4f ms a replicate  log score %.5f to %.5f, area of cause 0 %.5f to "
            "%.5f\n",
            threads, threads == 1 ? " " : "s", took.count(),
            took.count() / static_cast<double>(options.replicates), got.log_score->low, got.log_score->high,
            got.area[0]->low, got.area[0]->high);
    }
    {
        const auto start = std::chrono::steady_clock::now();
        static_cast<void>(steelyard::engine::audit(sample, {.replicates = 0}));
        const std::chrono::duration<double, std::milli> took = std::chrono::steady_clock::now() - start;
        std::printf("all point figures %9.1f ms\n", took.count());
    }
    std::fflush(stdout);
    const std::string peer = std::string(argv[3]) + " " + argv[4] + " " + argv[1] + " " + argv[5];
    return std::system(peer.c_str()) == 0 ? 0 : 1;  // NOLINT: a bench, run by hand
}
