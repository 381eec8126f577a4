// SPDX-License-Identifier: Apache-2.0
// The strict reader on any bytes, as YAML and as JSON: it returns a tree or faults, and nothing else may
// happen.
#include <cstddef>
#include <cstdint>
#include <cstdlib>
#include <sstream>
#include <string>

#include "steelyard/document/node.hpp"

namespace {

namespace document = steelyard::document;

/// Tight limits keep one input quick; the paths are the same.
document::Limits small_limits() {
    document::Limits limits;
    limits.bytes = 65536;
    limits.values = 2000;
    return limits;
}

void read(const std::string& text, document::Syntax syntax) {
    document::Diagnostics faults;
    const auto tree = document::parse(text, "input", syntax, faults, small_limits());
    if (!tree && faults.empty()) {
        std::abort();  // neither a tree nor a reason
    }
    std::ostringstream out;
    document::print(out, faults);
    if (faults.empty() != out.str().empty()) {
        std::abort();
    }
    for (const char c : out.str()) {
        if ((c >= 0 && c < ' ' && c != '\n') || c == '\x7F') {
            std::abort();  // a control character of the input came through
        }
    }
}

}  // namespace

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    const std::string text(data, data + size);
    read(text, document::Syntax::yaml);
    read(text, document::Syntax::json);
    return 0;
}
