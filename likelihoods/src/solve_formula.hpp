// SPDX-License-Identifier: Apache-2.0
#pragma once
// The formulas of derived.cpp solved for one of their analytes. chemistry.hpp states formulas, units and
// sources.

#include <span>
#include <string_view>
#include <vector>

#include "steelyard/likelihoods/derived.hpp"

namespace steelyard::likelihoods::detail {

/// What a formula takes beside analytes.
struct Person {
    double age = 40.0;  ///< [a]
    bool female = false;
    const ChemistrySettings* settings = nullptr;
};

/// One way to give a derived quantity a wanted value: solve for `free`, the others being known.
struct Solution {
    std::string_view quantity;             ///< derived id
    std::string_view free;                 ///< analyte solved for
    std::vector<std::string_view> others;  ///< analytes that must be known
    bool needs_person = false;             ///< sex and age must be stated
    /// The value of `free`; NaN or outside its range where there is none. @param x  values of `others`
    double (*solve)(double wanted, std::span<const double> x, const Person& person);
    /// The quantity itself. @param free  value of the analyte solved for
    double (*evaluate)(double free, std::span<const double> x, const Person& person);
};

/// All ways, those of one quantity in order of preference.
std::span<const Solution> solutions();

}  // namespace steelyard::likelihoods::detail
