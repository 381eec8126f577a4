// SPDX-License-Identifier: Apache-2.0
// Property tests run on the same 1000 cases every time, unless RC_PARAMS says otherwise.
#include <cstdlib>

namespace {

[[maybe_unused]] const int is_set = setenv("RC_PARAMS", "seed=20260101 max_success=1000", 0);

}  // namespace
