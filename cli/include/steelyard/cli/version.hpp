// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string_view>

namespace steelyard::cli {

/// The program's version, `0.1.0`.
std::string_view version() noexcept;

}  // namespace steelyard::cli
