// SPDX-License-Identifier: Apache-2.0
#include "steelyard/document/source_position.hpp"

namespace steelyard::document {

std::string to_string(const SourcePosition& position) {
    if (position.line <= 0) {
        return position.file;
    }
    return position.file + ':' + std::to_string(position.line) + ':' + std::to_string(position.column);
}

}  // namespace steelyard::document
