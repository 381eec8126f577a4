// SPDX-License-Identifier: Apache-2.0
// The prior sets built into the program, and opening a set by name or by path.
#include <fmt/format.h>

#include <filesystem>
#include <optional>
#include <stdexcept>

#include "shipped_set_texts.hpp"
#include "steelyard/document/strict_map.hpp"
#include "steelyard/priors/prior_set.hpp"

namespace steelyard::priors {

namespace {

constexpr std::string_view prefix = "shipped:";
constexpr std::string_view ending = ".yaml";

/// The text of a shipped set by its name, with or without `shipped:`.
std::optional<std::string_view> find_shipped(std::string_view name) {
    if (name.starts_with(prefix)) {
        name.remove_prefix(prefix.size());
    }
    for (const auto& [file, text] : detail::shipped_set_texts()) {
        if (file.substr(0, file.size() - ending.size()) == name) {
            return text;
        }
    }
    return std::nullopt;
}

/// A word that can only have been meant as the name of a shipped set: no folder, no ending, no such file.
bool is_meant_as_name(const std::string& word) {
    std::error_code ignored;
    return word.starts_with(prefix) || (word != "-" && word.find_first_of("/.") == std::string::npos &&
                                        !std::filesystem::exists(word, ignored));
}

[[noreturn]] void refuse_name(const std::string& word) {
    const std::vector<std::string> names = shipped_prior_sets();
    const std::string_view bare = std::string_view(word).substr(word.starts_with(prefix) ? prefix.size() : 0);
    const std::string close = document::nearest(bare, names);
    document::Diagnostics faults;
    faults.add({word, 0, 0}, document::Code::unreadable_file,
               "no shipped prior set has this name, and there is no such file",
               close.empty() ? fmt::format("shipped are {}", fmt::join(names, ", "))
                             : fmt::format("did you mean {}?", close));
    throw document::LoadError(std::move(faults));
}

}  // namespace

std::vector<std::string> shipped_prior_sets() {
    std::vector<std::string> names;
    for (const auto& [file, text] : detail::shipped_set_texts()) {
        names.emplace_back(file.substr(0, file.size() - ending.size()));
    }
    return names;
}

std::string shipped_prior_text(std::string_view name) {
    const std::optional<std::string_view> text = find_shipped(name);
    if (!text) {
        throw std::invalid_argument(fmt::format("no shipped prior set is named '{}'", name));
    }
    return std::string(*text);
}

PriorSet open_prior_set(const std::string& name_or_path, const std::vector<std::string>& known_causes) {
    const std::optional<std::string_view> text = find_shipped(name_or_path);
    if (!text) {
        if (is_meant_as_name(name_or_path)) {
            refuse_name(name_or_path);
        }
        return load_prior_set(name_or_path, known_causes);
    }
    const std::string bare =
        name_or_path.starts_with(prefix) ? name_or_path.substr(prefix.size()) : name_or_path;
    const std::string name = std::string(prefix) + bare;
    PriorSet set = read_prior_set(*text, name + std::string(ending), known_causes);
    set.name = name;
    return set;
}

}  // namespace steelyard::priors
