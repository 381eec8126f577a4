// SPDX-License-Identifier: Apache-2.0
#include "arrange.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "steelyard/engine/ledger.hpp"
#include "wording.hpp"

namespace steelyard::likelihoods::detail {
namespace {

/// @param tables  indices into the set's tables, and so into the findings
std::vector<FindingReading*> members_of(const std::vector<std::size_t>& tables,
                                        std::vector<FindingReading>& findings) {
    std::vector<FindingReading*> members;
    members.reserve(tables.size());
    for (const std::size_t table : tables) {
        members.push_back(&findings[table]);
    }
    return members;
}

/// Of each list of alternatives only the first that can be read is read; the others are set aside, or barred
/// when they are missing. A missing one that is preferred to what is read is not barred: it would be read.
void prefer(const TableSet& set, std::vector<FindingReading>& findings) {
    for (const OneOf& list : set.one_of) {
        const std::vector<FindingReading*> members = members_of(list.tables, findings);
        const auto first = std::find_if(members.begin(), members.end(), [](const FindingReading* member) {
            return member->use == Use::read;
        });
        if (first == members.end()) {
            continue;
        }
        const auto reason = [&] {
            return fmt::format("the {} is read in its place", in_sentence(set.tables[(*first)->table].title));
        };
        for (auto later = first + 1; later != members.end(); ++later) {
            FindingReading* member = *later;
            if (member->use == Use::read) {
                member->use = Use::set_aside;
                member->why_not = reason();
                member->passed_over = true;
            } else if (member->use == Use::missing && member->barred.empty()) {
                member->barred = reason();
                member->passed_over = true;
            }
        }
    }
}

void weigh_groups(const TableSet& set, std::vector<FindingReading>& findings) {
    for (const Group& group : set.groups) {
        std::vector<FindingReading*> members = members_of(group.tables, findings);
        std::erase_if(members, [](const FindingReading* member) { return member->use != Use::read; });
        if (members.empty()) {
            continue;
        }
        const double weight = engine::dependence_weight(static_cast<int>(members.size()), group.rho);
        for (FindingReading* member : members) {
            member->weight = weight;
            member->group = weight < 1.0 ? group.name : "";
        }
    }
}

}  // namespace

void arrange(const TableSet& set, std::vector<FindingReading>& findings) {
    prefer(set, findings);
    weigh_groups(set, findings);
}

void take_apart(std::vector<FindingReading>& findings) {
    for (FindingReading& reading : findings) {
        reading.weight = 1.0;
        reading.group.clear();
        if (reading.passed_over) {
            reading.passed_over = false;
            if (reading.use == Use::set_aside) {
                reading.use = Use::read;
                reading.why_not.clear();
            } else {
                reading.barred.clear();
            }
        }
    }
}

}  // namespace steelyard::likelihoods::detail
