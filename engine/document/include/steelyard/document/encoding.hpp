// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string_view>

namespace steelyard::document {

/// Whether bytes are UTF-8, strictly: no overlong forms, no surrogates, nothing above U+10FFFF.
bool is_utf8(std::string_view bytes) noexcept;

}  // namespace steelyard::document
