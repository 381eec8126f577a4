// SPDX-License-Identifier: Apache-2.0
// Reads a tally strictly: what the program did not write is refused at its place.
#include <fmt/format.h>

#include <charconv>
#include <cstring>
#include <fstream>
#include <iostream>
#include <istream>
#include <nlohmann/json.hpp>
#include <unordered_map>

#include "steelyard/cli/tally_file.hpp"
#include "steelyard/cli/terminal.hpp"
#include "steelyard/document/strict_map.hpp"

namespace steelyard::cli {

using document::Code;
using document::Diagnostics;
using document::Node;
using document::StrictMap;
using likelihoods::GateStatus;

namespace {

constexpr std::size_t longest_line = std::size_t{8} * 1024 * 1024;
constexpr std::size_t most_faults = 20;  // one slip repeats itself on every line

/// Lines of a byte source. A line without its end is told apart: writing was cut off there.
class Lines {
  public:
    explicit Lines(const ReadBytes& bytes) : bytes_(bytes), buffer_(std::size_t{1} << 16U) {}

    enum class Next { line, cut_off, too_long, end };
    Next next(std::string& line) {
        line.clear();
        while (true) {
            if (at_ == filled_) {
                filled_ = bytes_(buffer_.data(), buffer_.size());
                at_ = 0;
                if (filled_ == 0) {
                    return line.empty() ? Next::end : Next::cut_off;
                }
            }
            const char* begin = buffer_.data() + at_;
            const void* end = std::memchr(begin, '\n', filled_ - at_);
            const std::size_t length = end == nullptr
                                           ? filled_ - at_
                                           : static_cast<std::size_t>(static_cast<const char*>(end) - begin);
            if (line.size() + length > longest_line) {
                return Next::too_long;
            }
            line.append(begin, length);
            at_ += length;
            if (end != nullptr) {
                ++at_;
                return Next::line;
            }
        }
    }

  private:
    const ReadBytes& bytes_;
    std::vector<char> buffer_;
    std::size_t at_ = 0, filled_ = 0;
};

std::optional<std::uint64_t> whole(const Node* node, std::string_view what, Diagnostics& faults,
                                   std::uint64_t least = 0) {
    if (node == nullptr) {
        return std::nullopt;
    }
    const std::string& text = node->text;
    std::uint64_t value = 0;
    const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
    const bool plain_number = node->kind == document::Kind::scalar && !node->quoted && !text.empty() &&
                              error == std::errc() && end == text.data() + text.size();
    if (!plain_number) {
        faults.add(node->where(), Code::not_a_number, fmt::format("{} must be a whole number", what));
        return std::nullopt;
    }
    if (value < least || value > Tally::most_patients) {
        faults.add(node->where(), Code::out_of_range,
                   fmt::format("{} must be a whole number from {} to 2^53", what, least));
        return std::nullopt;
    }
    return value;
}

std::optional<std::string> any_text(const Node* node, std::string_view what, Diagnostics& faults) {
    if (node == nullptr) {
        return std::nullopt;
    }
    if (node->kind != document::Kind::scalar || !node->quoted) {
        faults.add(node->where(), Code::wrong_type, fmt::format("{} must be a text in quotes", what));
        return std::nullopt;
    }
    return node->text;
}

std::vector<std::string> texts_of(const Node* node, std::string_view what, Diagnostics& faults) {
    if (node == nullptr) {
        return {};
    }
    return document::read_texts(*node, what, faults).value_or(std::vector<std::string>{});
}

/// The one reading of a JSON string that the program would have written; the program's own escapes only.
std::optional<std::string> unquoted(std::string_view token) {
    const nlohmann::json value = nlohmann::json::parse(token, nullptr, false);
    if (!value.is_string() || value.dump() != token) {
        return std::nullopt;
    }
    return value.get<std::string>();
}

}  // namespace

class TallyReader {
  public:
    TallyReader(const std::string& file, Diagnostics& faults)
        : file_(file), faults_(faults), faults_before_(faults.size()) {}

    std::optional<Tally> read(const ReadBytes& bytes) {
        Lines lines(bytes);
        std::string line;
        const Lines::Next first = lines.next(line);
        if (first != Lines::Next::line) {
            fault(line, 0, first == Lines::Next::end ? Code::empty_document : Code::bad_tally,
                  first == Lines::Next::end ? "the file is empty"
                                            : "the first line is not the head of a tally");
            return std::nullopt;
        }
        read_head(line);
        if (!tally_) {
            return std::nullopt;
        }
        while (failures() < most_faults) {
            ++line_number_;
            const Lines::Next next = lines.next(line);
            if (next == Lines::Next::end) {
                break;
            }
            if (next == Lines::Next::line) {
                read_cell(line);
                continue;
            }
            fault(line, line.size(), Code::bad_tally,
                  next == Lines::Next::cut_off ? "the last line is cut off" : "the line is too long",
                  "the file is not whole; make or copy it again");
            return std::nullopt;
        }
        if (failures() == 0) {
            check_totals();
        }
        return failures() == 0 ? std::move(tally_) : std::nullopt;
    }

  private:
    std::size_t failures() const { return faults_.size() - faults_before_; }

    void fault(std::string_view line, std::size_t at, Code code, std::string message, std::string hint = {}) {
        constexpr std::size_t longest_shown = 512;
        document::Diagnostic entry{
            {file_, line_number_, static_cast<int>(at) + 1}, code, std::move(message), std::move(hint), {}};
        if (line.size() <= longest_shown) {
            entry.source_line = std::string(line);
        }
        faults_.add(std::move(entry));
    }

    void read_head(const std::string& line) {
        const std::optional<Node> root = document::parse(line, file_, document::Syntax::json, faults_);
        if (!root) {
            return;
        }
        StrictMap map(*root, "", faults_);
        if (!map.usable() || !map.require_format("steelyard.tally/1")) {
            return;
        }
        TallyHead head;
        head.versions = texts_of(map.required("versions"), "versions", faults_);
        if (const Node* node = map.required("tables")) {
            StrictMap tables(*node, "tables", faults_);
            head.tables_title = any_text(tables.required("title"), "tables.title", faults_).value_or("");
            head.tables_digest = any_text(tables.required("digest"), "tables.digest", faults_).value_or("");
            tables.finish();
        }
        head.reading_digest = any_text(map.required("reading"), "reading", faults_).value_or("");
        head.causes = texts_of(map.required("causes"), "causes", faults_);
        read_findings(map.required("findings"), head);
        head.by = texts_of(map.required("by"), "by", faults_);
        constexpr std::array<std::string_view, 2> spans{"month", "none"};
        head.months = map.required_choice("over", spans) == "month";
        head.least_cell = whole(map.required("least_cell"), "least_cell", faults_, 1).value_or(1);
        check_words(head.versions, "versions", map);
        check_words(head.causes, "causes", map);
        TallyLoss lost;
        if (const Node* node = map.required("lost")) {
            StrictMap entry(*node, "lost", faults_);
            lost.cells = whole(entry.required("cells"), "lost.cells", faults_).value_or(0);
            lost.patients = whole(entry.required("patients"), "lost.patients", faults_).value_or(0);
            entry.finish();
        }
        TallyFlow flow;
        const Node* flow_node = map.required("flow");
        if (flow_node != nullptr) {
            flow = read_flow(*flow_node);
        }
        const Node* out_of_scope = map.required("out_of_scope");
        const Node* cells = map.required("cells");
        cells_told_ = whole(cells, "cells", faults_).value_or(0);
        map.finish();
        if (failures() > 0) {
            return;
        }
        tally_.emplace(std::move(head));
        tally_->lost_ = lost;
        read_out_of_scope(*out_of_scope, flow.out_of_scope);
        flow_ = flow;
        flow_at_ = flow_node->where();
        cells_at_ = cells->where();
        for (const TalliedFinding& finding : tally_->head().findings) {
            states_.push_back(finding.states);
        }
        if (failures() > 0) {
            tally_.reset();
        }
    }

    /// Sorted versions and distinct causes, as the program writes them.
    void check_words(std::vector<std::string> words, const char* key, StrictMap& map) {
        std::vector<std::string> sorted = words;
        std::sort(sorted.begin(), sorted.end());
        const bool distinct = std::adjacent_find(sorted.begin(), sorted.end()) == sorted.end();
        const bool in_order = std::string_view(key) != "versions" || sorted == words;
        if (words.empty() || !distinct || !in_order || words.size() >= Tally::most_words) {
            if (const Node* node = map.optional(key)) {
                faults_.add(
                    node->where(), Code::bad_tally,
                    fmt::format("{} must be a list of different texts, as the program writes it", key));
            }
        }
    }

    void read_findings(const Node* node, TallyHead& head) {
        if (node == nullptr) {
            return;
        }
        if (node->kind != document::Kind::sequence || node->items.empty()) {
            faults_.add(node->where(), Code::wrong_type, "findings must be a list");
            return;
        }
        for (const Node& item : node->items) {
            StrictMap map(item, "findings", faults_);
            TalliedFinding finding;
            finding.id = any_text(map.required("id"), "findings.id", faults_).value_or("");
            const Node* states = map.required("states");
            const std::uint64_t count = whole(states, "findings.states", faults_, 3).value_or(3);
            if (count > 256) {
                faults_.add(states->where(), Code::out_of_range, "findings.states must be from 3 to 256");
            }
            finding.states = static_cast<int>(std::min<std::uint64_t>(count, 256));
            map.finish();
            head.findings.push_back(std::move(finding));
        }
    }

    TallyFlow read_flow(const Node& node) {
        StrictMap map(node, "flow", faults_);
        const std::size_t before = faults_.size();
        const auto number = [&](const char* key) {
            return whole(map.required(key), map.name(key), faults_).value_or(0);
        };
        TallyFlow flow;
        flow.read = number("read");
        flow.weighed = number("weighed");
        flow.out_of_scope = number("out_of_scope");
        flow.set_aside = number("set_aside");
        flow.diagnosed = number("diagnosed");
        flow.outside = number("outside");
        flow.undiagnosed = number("undiagnosed");
        map.finish();
        if (map.usable() && faults_.size() == before &&
            (flow.read != flow.weighed + flow.out_of_scope + flow.set_aside ||
             flow.weighed != flow.diagnosed + flow.outside + flow.undiagnosed ||
             flow.read > Tally::most_patients)) {
            faults_.add(
                node.where(), Code::bad_tally,
                "the counts do not add up: read must be weighed + out_of_scope + set_aside, and weighed "
                "must be diagnosed + outside + undiagnosed");
        }
        return flow;
    }

    void read_out_of_scope(const Node& node, std::uint64_t total) {
        if (node.kind != document::Kind::sequence) {
            faults_.add(node.where(), Code::wrong_type, "out_of_scope must be a list");
            return;
        }
        std::uint64_t sum = 0;
        std::optional<std::string> last;
        for (const Node& item : node.items) {
            StrictMap map(item, "out_of_scope", faults_);
            const auto cause = any_text(map.required("final_cause"), "out_of_scope.final_cause", faults_);
            const auto patients =
                whole(map.required("patients"), "out_of_scope.patients", faults_, tally_->head().least_cell);
            map.finish();
            if (!cause || !patients) {
                continue;
            }
            if (last && *cause <= *last) {
                faults_.add(item.where(), Code::bad_tally, "final causes are repeated or not in order");
                continue;
            }
            last = cause;
            sum += *patients;
            try {
                tally_->add({}, GateStatus::out_of_scope, *cause, {}, {}, *patients);
            } catch (const TallyError& error) {
                faults_.add(item.where(), Code::bad_tally, error.what());
            }
        }
        if (sum > total || (sum != total && tally_->head().least_cell == 1)) {
            faults_.add(node.where(), Code::bad_tally,
                        fmt::format("the patients out of scope are {} here and {} in flow", sum, total));
        }
    }

    /// A string of the line from `at`, with its quotes; empty when there is none.
    static std::string_view string_token(std::string_view line, std::size_t at) {
        if (at >= line.size() || line[at] != '"') {
            return {};
        }
        for (std::size_t i = at + 1; i < line.size(); ++i) {
            if (line[i] == '\\') {
                ++i;
            } else if (line[i] == '"') {
                return line.substr(at, i + 1 - at);
            }
        }
        return {};
    }

    const std::string* word(std::string_view token) {
        const auto known = words_.find(std::string(token));
        if (known != words_.end()) {
            return &known->second;
        }
        std::optional<std::string> text = unquoted(token);
        return text ? &words_.emplace(token, std::move(*text)).first->second : nullptr;
    }

    void read_cell(std::string_view line) {
        // [code, gate, cause, stratum, month, patients], without spaces.
        std::array<std::string_view, 5> tokens;
        std::size_t at = 0;
        for (std::size_t i = 0; i < tokens.size(); ++i) {
            const char before = i == 0 ? '[' : ',';
            if (at >= line.size() || line[at] != before) {
                return shape_fault(line, at);
            }
            tokens[i] = string_token(line, ++at);
            if (tokens[i].empty()) {
                return shape_fault(line, at);
            }
            at += tokens[i].size();
        }
        if (at >= line.size() || line[at] != ',') {
            return shape_fault(line, at);
        }
        ++at;
        std::uint64_t patients = 0;
        const char* begin = line.data() + at;
        const auto [end, error] = std::from_chars(begin, line.data() + line.size(), patients);
        if (error != std::errc() || *begin == '0' || patients > Tally::most_patients) {
            return fault(line, at, Code::out_of_range,
                         "the number of patients must be a whole number above 0");
        }
        if (std::string_view(end, static_cast<std::size_t>(line.data() + line.size() - end)) != "]") {
            return shape_fault(line, static_cast<std::size_t>(end - line.data()));
        }
        if (patients < tally_->head().least_cell) {
            return fault(line, at, Code::bad_tally,
                         fmt::format("a cell of {}, although those below {} are said to have been dropped",
                                     patients, tally_->head().least_cell));
        }
        add_cell(line, tokens, patients);
    }

    void shape_fault(std::string_view line, std::size_t at) {
        fault(line, at, Code::bad_tally, "this is not a cell as the program writes it",
              R"(["pattern","in_scope","final cause","stratum","month",patients], without spaces)");
    }

    void add_cell(std::string_view line, const std::array<std::string_view, 5>& tokens,
                  std::uint64_t patients) {
        const auto place = [&](std::size_t i) {
            return static_cast<std::size_t>(tokens[i].data() - line.data());
        };
        const std::string_view characters = tokens[0].substr(1, tokens[0].size() - 2);
        const std::optional<likelihoods::PatternCode> code =
            likelihoods::code_from_characters(states_, characters);
        if (!code) {
            return fault(line, place(0), Code::bad_tally, "this is no pattern of the findings in the head");
        }
        const bool caution = tokens[1] == "\"caution\"";
        if (!caution && tokens[1] != "\"in_scope\"") {
            return fault(line, place(1), Code::bad_choice, "the gate must be \"in_scope\" or \"caution\"");
        }
        const std::string* cause = word(tokens[2]);
        const std::string* stratum = word(tokens[3]);
        const std::string* month = word(tokens[4]);
        for (const auto& [text, i] : {std::pair{cause, 2U}, {stratum, 3U}, {month, 4U}}) {
            if (text == nullptr) {
                return fault(line, place(i), Code::bad_tally, "this is not text as the program writes it");
            }
        }
        const auto key = std::tuple<std::string_view, std::string_view, std::string_view, std::string_view,
                                    std::string_view>(characters, tokens[1], *cause, *stratum, *month);
        const auto last =
            std::tuple<std::string_view, std::string_view, std::string_view, std::string_view,
                       std::string_view>(last_code_, last_gate_, last_cause_, last_stratum_, last_month_);
        if (started_ && key <= last) {
            return fault(line, 0, Code::bad_tally,
                         key == last ? "this cell stands here twice" : "the cells are not in order");
        }
        started_ = true;
        last_code_ = characters;
        last_gate_ = tokens[1];
        last_cause_ = *cause;
        last_stratum_ = *stratum;
        last_month_ = *month;
        try {
            tally_->add(*code, caution ? GateStatus::caution : GateStatus::in_scope, *cause, *stratum, *month,
                        patients);
        } catch (const TallyError& error) {
            fault(line, place(2), Code::bad_tally, error.what());
        } catch (const std::invalid_argument& error) {
            fault(line, place(3), Code::bad_tally, error.what());
        }
    }

    void check_totals() {
        const std::size_t cells = tally_->cells();
        if (cells != cells_told_) {
            faults_.add(cells_at_, Code::bad_tally,
                        fmt::format("{} cells are promised here, and {} follow", cells_told_, cells),
                        "the file is not whole; make or copy it again");
            return;
        }
        const TallyFlow held = tally_->flow();
        const bool none_lost = tally_->lost() == TallyLoss{};
        const bool within = held.diagnosed <= flow_.diagnosed && held.outside <= flow_.outside &&
                            held.undiagnosed <= flow_.undiagnosed;
        if (!within || held.weighed + tally_->lost().patients != flow_.weighed ||
            (tally_->head().least_cell == 1 && !none_lost)) {
            faults_.add(flow_at_, Code::bad_tally,
                        fmt::format("the cells hold {} patients and {} were dropped, but {} were weighed",
                                    held.weighed, tally_->lost().patients, flow_.weighed));
            return;
        }
        tally_->diagnosed_ = flow_.diagnosed;
        tally_->outside_ = flow_.outside;
        tally_->undiagnosed_ = flow_.undiagnosed;
        tally_->out_of_scope_total_ = flow_.out_of_scope;
        tally_->set_aside_ = flow_.set_aside;
        tally_->all_ = flow_.read;
    }

    const std::string& file_;
    Diagnostics& faults_;
    std::size_t faults_before_;
    int line_number_ = 1;
    std::optional<Tally> tally_;
    TallyFlow flow_;
    std::uint64_t cells_told_ = 0;
    document::SourcePosition flow_at_, cells_at_;
    std::vector<int> states_;
    std::unordered_map<std::string, std::string> words_;
    bool started_ = false;
    std::string last_code_, last_gate_, last_cause_, last_stratum_, last_month_;
};

ReadBytes bytes_of(std::istream& in) {
    return [&in](char* to, std::size_t most) {
        in.read(to, static_cast<std::streamsize>(most));
        return static_cast<std::size_t>(in.gcount());
    };
}

std::optional<Tally> read_tally(const ReadBytes& bytes, const std::string& file, Diagnostics& faults) {
    return TallyReader(file, faults).read(bytes);
}

std::optional<Tally> read_tally(std::string_view text, const std::string& file, Diagnostics& faults) {
    return read_tally(
        [text](char* to, std::size_t most) mutable {
            const std::size_t count = text.copy(to, most);
            text.remove_prefix(count);
            return count;
        },
        file, faults);
}

std::optional<Tally> load_tally(const std::string& path, Diagnostics& faults) {
    if (path == "-") {
        return read_tally(bytes_of(std::cin), path, faults);
    }
    std::ifstream in(path, std::ios::binary);
    if (!in) {
        faults.add({path, 0, 0}, Code::unreadable_file, "the file cannot be read");
        return std::nullopt;
    }
    return read_tally(bytes_of(in), path, faults);
}

}  // namespace steelyard::cli
