// SPDX-License-Identifier: Apache-2.0
// Reads the texts of a table set. Nothing is used before everything is read: the heads of all files first,
// then what refers across files, so that one run reports every fault of every file.
#include "steelyard/likelihoods/read_table_set.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <deque>

#include "read_set_file.hpp"
#include "read_table_file.hpp"

namespace steelyard::likelihoods {
namespace {

using detail::PlacedText;
using detail::SetFile;
using detail::SetNames;
using detail::TableFile;
using document::Code;
using document::Diagnostics;
using document::NamedText;
using document::Node;

constexpr std::array<std::string_view, 3> set_file_names = {"set.yaml", "set.yml", "set.json"};

bool is_set_file(std::string_view name) {
    return std::find(set_file_names.begin(), set_file_names.end(), name) != set_file_names.end();
}

std::string stem(std::string_view name) {
    return std::string(name.substr(0, name.rfind('.')));
}

/// Everything between texts and the checked set. Documents are kept in a deque, so that pointers into them
/// stay.
class SetReader {
  public:
    SetReader(const std::vector<NamedText>& files, std::string name)
        : files_(files), name_(std::move(name)) {}

    TableSet run() {
        set_.name = name_;
        set_.digest = document::digest(files_);
        read_set_head();
        read_table_heads();
        check_findings();
        finish_tables();
        order_tables();
        detail::finish_set_file(set_file_, finding_ids_, set_, faults_);
        index_members();
        if (!faults_.empty()) {
            throw document::LoadError(std::move(faults_));
        }
        std::stable_partition(set_.causes.begin(), set_.causes.end(),
                              [](const Cause& cause) { return cause.parts.empty(); });
        return std::move(set_);
    }

  private:
    const Node* parse(const NamedText& file) {
        const std::string path = name_.empty() ? file.first : name_ + "/" + file.first;
        faults_.remember_text(path, file.second);
        std::optional<Node> node =
            document::parse(file.second, path, document::syntax_of(file.first, file.second), faults_);
        if (!node) {
            return nullptr;
        }
        documents_.push_back(std::move(*node));
        return &documents_.back();
    }

    void read_set_head() {
        bool found = false;
        for (const NamedText& file : files_) {
            if (!is_set_file(file.first)) {
                continue;
            }
            if (found) {
                faults_.add({name_ + "/" + file.first, 0, 0}, Code::conflicting_values,
                            "the set has two set files", "keep one of set.yaml, set.yml and set.json");
                continue;
            }
            found = true;
            if (const Node* root = parse(file)) {
                set_file_ = detail::begin_set_file(*root, set_, faults_);
            }
        }
        if (!found) {
            faults_.add({name_, 0, 0}, Code::missing_file, "the table set has no set.yaml",
                        "a table set is a folder with set.yaml and one file for each finding");
        }
        for (const Cause& cause : set_.causes) {
            if (!cause.parts.empty()) {
                names_.composites.push_back(cause.id);
            } else {
                names_.single_causes.push_back(cause.id);
                names_.cause_titles.push_back(cause.title);
            }
        }
    }

    void read_table_heads() {
        for (const NamedText& file : files_) {
            if (is_set_file(file.first)) {
                continue;
            }
            const Node* root = parse(file);
            if (root == nullptr) {
                unreadable_.push_back(stem(file.first));
                continue;
            }
            TableFile table = detail::begin_table_file(*root, stem(file.first), faults_);
            if (!table.map || table.table.finding.empty() || !table.kind_known) {
                // Its finding is a slip or missing; taking the file's name for it spares faults that only
                // follow from that.
                unreadable_.push_back(stem(file.first));
            }
            if (table.map) {
                tables_.push_back(std::move(table));
            }
        }
    }

    /// The files against the list `findings`, and joint tables against the others.
    void check_findings() {
        std::vector<std::string> listed;
        for (const PlacedText& finding : set_file_.findings) {
            listed.push_back(finding.text);
        }
        for (const TableFile& file : tables_) {
            const std::string& finding = file.table.finding;
            if (finding.empty() || !file.kind_known) {
                continue;
            }
            if (detail::contains(finding_ids_, finding)) {
                faults_.add(file.finding_at, Code::duplicate_finding,
                            fmt::format("finding: another file of this set is about {} too", finding));
                continue;
            }
            finding_ids_.push_back(finding);
            if (set_file_.findings_read && !detail::contains(listed, finding)) {
                faults_.add(file.finding_at, Code::unknown_finding,
                            fmt::format("finding: {} is not listed under findings in set.yaml", finding),
                            detail::name_hint(finding, listed));
            }
        }
        for (const PlacedText& finding : set_file_.findings) {
            if (detail::contains(finding_ids_, finding.text)) {
                continue;
            }
            if (!detail::contains(unreadable_, finding.text)) {
                faults_.add(
                    finding.where, Code::missing_file,
                    fmt::format("findings lists {}, but no file of this set is about it", finding.text),
                    fmt::format("add {}.yaml, or take the finding out of the list", finding.text));
            }
            finding_ids_.push_back(finding.text);  // so that groups naming it are not faulted a second time
        }
        check_joint_members();
    }

    void check_joint_members() {
        std::vector<std::string> members;
        for (const TableFile& file : tables_) {
            for (const std::string& member : file.table.joint_of) {
                const Node* at = file.root->find("joint_of");
                if (detail::contains(finding_ids_, member)) {
                    faults_.add(
                        at->where(), Code::bad_joint,
                        fmt::format("joint_of: {} has a table of its own, so its evidence would count twice",
                                    member));
                } else if (detail::contains(members, member)) {
                    faults_.add(at->where(), Code::bad_joint,
                                fmt::format("joint_of: {} is in another joint table", member));
                }
                members.push_back(member);
            }
        }
    }

    void finish_tables() {
        TableSet heads;
        for (const TableFile& file : tables_) {
            heads.tables.push_back(file.table);
        }
        heads.features = set_.features;
        names_.vocabulary = heads.vocabulary();
        names_.features_known = set_file_.map != nullptr;
        for (TableFile& file : tables_) {
            detail::finish_table_file(file, names_, faults_);
        }
    }

    /// Tables in the order of `findings`; those not listed come last (and are faults already).
    void order_tables() {
        const auto rank = [&](const TableFile& file) {
            return std::find_if(
                set_file_.findings.begin(), set_file_.findings.end(),
                [&](const PlacedText& finding) { return finding.text == file.table.finding; });
        };
        std::stable_sort(tables_.begin(), tables_.end(),
                         [&](const TableFile& a, const TableFile& b) { return rank(a) < rank(b); });
        for (TableFile& file : tables_) {
            set_.tables.push_back(std::move(file.table));
        }
    }

    /// Where the findings of groups and alternatives stand in the set.
    void index_members() {
        const auto indices = [&](const std::vector<std::string>& findings) {
            std::vector<std::size_t> tables;
            for (const std::string& finding : findings) {
                const auto table =
                    std::find_if(set_.tables.begin(), set_.tables.end(),
                                 [&](const EvidenceTable& one) { return one.finding == finding; });
                if (table != set_.tables.end()) {
                    tables.push_back(static_cast<std::size_t>(table - set_.tables.begin()));
                }
            }
            return tables;
        };
        for (Group& group : set_.groups) {
            group.tables = indices(group.findings);
        }
        for (OneOf& list : set_.one_of) {
            list.tables = indices(list.findings);
        }
    }

    const std::vector<NamedText>& files_;
    std::string name_;
    Diagnostics faults_;
    std::deque<Node> documents_;
    TableSet set_;
    SetFile set_file_;
    SetNames names_;
    std::vector<TableFile> tables_;
    std::vector<std::string> finding_ids_;
    std::vector<std::string> unreadable_;  ///< stems of files whose finding could not be read
};

}  // namespace

TableSet read_table_set(const std::vector<NamedText>& files, const std::string& name) {
    return SetReader(files, name).run();
}

}  // namespace steelyard::likelihoods
