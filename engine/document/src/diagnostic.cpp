// SPDX-License-Identifier: Apache-2.0
#include "steelyard/document/diagnostic.hpp"

#include <algorithm>
#include <map>
#include <sstream>

#include "utf8.hpp"

namespace steelyard::document {

namespace {
/// Longer lines are not copied into each fault, so that many faults on one huge line stay cheap; print()
/// looks them up.
constexpr std::size_t longest_copied_line = 512;

std::string summary(const Diagnostics& faults) {
    std::ostringstream out;
    print(out, faults);
    return out.str();
}
}  // namespace

void Diagnostics::add(Diagnostic fault) {
    if (fault.source_line.empty()) {
        const std::string_view line = remembered_line(fault.where);
        if (line.size() <= longest_copied_line) {
            fault.source_line = line;
        }
    }
    faults_.push_back(std::move(fault));
}

void Diagnostics::add(const SourcePosition& where, Code code, std::string message, std::string hint) {
    add(Diagnostic{where, code, std::move(message), std::move(hint), {}});
}

std::vector<Diagnostic> Diagnostics::sorted() const {
    std::map<std::string_view, std::size_t> rank;
    for (const Text& text : texts_) {
        rank.emplace(text.file, rank.size());
    }
    for (const Diagnostic& fault : faults_) {
        rank.emplace(fault.where.file, rank.size());
    }
    std::vector<Diagnostic> list = faults_;
    std::stable_sort(list.begin(), list.end(), [&rank](const Diagnostic& a, const Diagnostic& b) {
        const std::size_t file_a = rank.at(a.where.file), file_b = rank.at(b.where.file);
        if (file_a != file_b) {
            return file_a < file_b;
        }
        return std::pair(a.where.line, a.where.column) < std::pair(b.where.line, b.where.column);
    });
    return list;
}

void Diagnostics::remember_text(const std::string& file, std::string_view text) {
    text = detail::without_byte_order_mark(text);
    const auto known =
        std::find_if(texts_.begin(), texts_.end(), [&file](const Text& entry) { return entry.file == file; });
    Text& entry = known == texts_.end() ? texts_.emplace_back() : *known;
    entry.file = file;
    entry.text = text;
    entry.line_starts.assign(1, 0);
    for (std::size_t at = text.find('\n'); at != std::string_view::npos; at = text.find('\n', at + 1)) {
        entry.line_starts.push_back(at + 1);
    }
}

std::string_view Diagnostics::remembered_line(const SourcePosition& where) const noexcept {
    for (const Text& entry : texts_) {
        if (entry.file != where.file) {
            continue;
        }
        const auto line = static_cast<std::size_t>(where.line);
        if (where.line <= 0 || line > entry.line_starts.size()) {
            return {};
        }
        const std::size_t begin = entry.line_starts[line - 1];
        const std::size_t end =
            line < entry.line_starts.size() ? entry.line_starts[line] - 1 : entry.text.size();
        std::string_view found = std::string_view(entry.text).substr(begin, end - begin);
        if (found.ends_with('\r')) {
            found.remove_suffix(1);
        }
        return found;
    }
    return {};
}

LoadError::LoadError(Diagnostics faults) : std::runtime_error(summary(faults)), faults_(std::move(faults)) {}

}  // namespace steelyard::document
