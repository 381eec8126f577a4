// SPDX-License-Identifier: Apache-2.0
#include <algorithm>
#include <numeric>

#include "steelyard/document/strict_map.hpp"

namespace steelyard::document {

namespace {
/// Fewest insertions, deletions, replacements and swaps of neighbours that turn a into b (optimal string
/// alignment).
std::size_t edit_distance(std::string_view a, std::string_view b) {
    std::vector<std::size_t> before_last(b.size() + 1), last(b.size() + 1), row(b.size() + 1);
    std::iota(row.begin(), row.end(), std::size_t{0});
    for (std::size_t i = 1; i <= a.size(); ++i) {
        before_last.swap(last);
        last.swap(row);
        row[0] = i;
        for (std::size_t j = 1; j <= b.size(); ++j) {
            const std::size_t differs = a[i - 1] == b[j - 1] ? 0 : 1;
            row[j] = std::min({last[j] + 1, row[j - 1] + 1, last[j - 1] + differs});
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1]) {
                row[j] = std::min(row[j], before_last[j - 2] + 1);
            }
        }
    }
    return row[b.size()];
}
}  // namespace

std::string nearest(std::string_view word, std::span<const std::string> known) {
    constexpr std::size_t longest = 64;  // no name of the formats is as long; hostile input stays cheap
    if (word.size() > longest) {
        return {};
    }
    std::size_t least = word.size() / 3 + 1;
    std::string best;
    for (const std::string& name : known) {
        const std::size_t gap =
            name.size() > word.size() ? name.size() - word.size() : word.size() - name.size();
        if (gap >= least) {
            continue;
        }
        const std::size_t distance = edit_distance(word, name);
        if (distance < least) {
            least = distance;
            best = name;
        }
    }
    return best;
}

}  // namespace steelyard::document
