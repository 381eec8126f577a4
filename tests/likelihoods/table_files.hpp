// SPDX-License-Identifier: Apache-2.0
#pragma once
// The small table set of the tests as texts, for tests that change one of them.

#include <gtest/gtest.h>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <sstream>
#include <string>
#include <utility>
#include <vector>

#include "steelyard/document/diagnostic.hpp"
#include "steelyard/likelihoods/read_table_set.hpp"

namespace steelyard::test {

using Files = std::vector<document::NamedText>;

inline std::string text_of(const std::filesystem::path& path) {
    std::ifstream in(path, std::ios::binary);
    if (!in) {
        ADD_FAILURE() << "cannot read " << path;
    }
    std::ostringstream text;
    text << in.rdbuf();
    return text.str();
}

inline std::filesystem::path small_folder() {
    return STEELYARD_TEST_DIR "/data/tables/small";
}

/// The files of tests/data/tables/small, sorted by name.
inline Files small_files() {
    Files files;
    for (const auto& entry : std::filesystem::directory_iterator(small_folder())) {
        files.emplace_back(entry.path().filename().string(), text_of(entry.path()));
    }
    std::sort(files.begin(), files.end());
    return files;
}

inline std::string& text_named(Files& files, const std::string& name) {
    const auto found =
        std::find_if(files.begin(), files.end(), [&](const auto& file) { return file.first == name; });
    if (found == files.end()) {
        throw std::logic_error("no file " + name);
    }
    return found->second;
}

/// The small set with one piece of text, which must occur once, replaced in one file.
inline Files small_files_with(const std::string& name, const std::string& old_text,
                              const std::string& new_text) {
    Files files = small_files();
    std::string& text = text_named(files, name);
    const std::size_t at = text.find(old_text);
    if (at == std::string::npos || text.find(old_text, at + 1) != std::string::npos) {
        throw std::logic_error(old_text + " does not occur exactly once in " + name);
    }
    text.replace(at, old_text.size(), new_text);
    return files;
}

inline likelihoods::TableSet small_set() {
    return likelihoods::read_table_set(small_files(), "small");
}

/// The faults that reading gives; none when it succeeds.
inline std::vector<document::Diagnostic> faults_of(const Files& files) {
    try {
        likelihoods::read_table_set(files, "small");
    } catch (const document::LoadError& error) {
        return error.faults().sorted();
    }
    return {};
}

/// `file line:column code`, one after another, for comparison with an expectation.
inline std::string summary_of(const std::vector<document::Diagnostic>& faults) {
    std::string text;
    for (const document::Diagnostic& fault : faults) {
        text += text.empty() ? "" : ", ";
        text += fault.where.file + " " + std::to_string(fault.where.line) + ":" +
                std::to_string(fault.where.column) + " " + std::string(document::to_string(fault.code));
    }
    return text;
}

inline std::string messages_of(const std::vector<document::Diagnostic>& faults) {
    std::string text;
    for (const document::Diagnostic& fault : faults) {
        text += document::to_string(fault.where) + ": " + fault.message + " (" + fault.hint + ")\n";
    }
    return text;
}

}  // namespace steelyard::test
