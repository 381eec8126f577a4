// SPDX-License-Identifier: Apache-2.0
// Where the texts of a table set come from: a folder, or the program itself.
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <array>
#include <filesystem>

#include "shipped_adult_tables.hpp"
#include "steelyard/likelihoods/read_table_set.hpp"

namespace steelyard::likelihoods {
namespace {

namespace fs = std::filesystem;
using document::Code;
using document::Diagnostics;
using document::NamedText;

constexpr std::string_view shipped_prefix = "shipped:";

[[noreturn]] void fail(const std::string& folder, Code code, std::string message) {
    Diagnostics faults;
    faults.add({folder, 0, 0}, code, std::move(message),
               fmt::format("give a folder with set.yaml in it, or one of the shipped sets: {}",
                           fmt::join(shipped_table_sets(), ", ")));
    throw document::LoadError(std::move(faults));
}

bool is_table_file(const fs::path& path) {
    constexpr std::array<std::string_view, 3> endings = {".yaml", ".yml", ".json"};
    const std::string name = path.filename().string();
    const std::string ending = path.extension().string();
    // Hidden files are an editor's, not the clinic's.
    return !name.starts_with('.') && std::find(endings.begin(), endings.end(), ending) != endings.end();
}

}  // namespace

TableSet load_table_set(const std::string& folder) {
    std::error_code error;
    if (!fs::is_directory(folder, error)) {
        fail(folder, Code::unreadable_file,
             fs::exists(folder, error)
                 ? fmt::format("{} is a file, but a table set is a folder", folder)
                 : fmt::format("there is no table set and no folder called {}", folder));
    }
    std::vector<std::string> names;
    for (fs::directory_iterator entry(folder, error); !error && entry != fs::directory_iterator();
         entry.increment(error)) {
        if (is_table_file(entry->path()) && !entry->is_directory(error)) {
            names.push_back(entry->path().filename().string());
        }
    }
    if (error) {
        fail(folder, Code::unreadable_file, fmt::format("{} cannot be read: {}", folder, error.message()));
    }
    if (names.empty()) {
        fail(folder, Code::missing_file, fmt::format("{} holds no .yaml, .yml or .json file", folder));
    }
    std::sort(names.begin(), names.end());
    Diagnostics faults;
    std::vector<NamedText> files;
    for (const std::string& name : names) {
        const fs::path path = fs::path(folder) / name;
        if (std::optional<std::string> text = document::read_text(path.string(), faults)) {
            files.emplace_back(name, std::move(*text));
        }
    }
    if (!faults.empty()) {
        throw document::LoadError(std::move(faults));
    }
    std::string name = folder;
    while (name.size() > 1 && name.back() == '/') {
        name.pop_back();
    }
    return read_table_set(files, name);
}

std::vector<std::string> shipped_table_sets() {
    return {"adult"};
}

std::vector<NamedText> shipped_table_files(std::string_view name) {
    std::vector<NamedText> files;
    if (name == "adult") {
        for (const auto& [file, text] : shipped_adult_tables()) {
            files.emplace_back(file, text);
        }
    }
    return files;
}

TableSet open_table_set(const std::string& name_or_folder) {
    std::string_view name = name_or_folder;
    const bool named_as_shipped = name.starts_with(shipped_prefix);
    if (named_as_shipped) {
        name.remove_prefix(shipped_prefix.size());
    }
    const std::vector<std::string> shipped = shipped_table_sets();
    if (std::find(shipped.begin(), shipped.end(), name) != shipped.end()) {
        return read_table_set(shipped_table_files(name), fmt::format("{}{}", shipped_prefix, name));
    }
    if (named_as_shipped) {
        fail(name_or_folder, Code::unreadable_file,
             fmt::format("there is no shipped table set called {}", name));
    }
    return load_table_set(name_or_folder);
}

}  // namespace steelyard::likelihoods
