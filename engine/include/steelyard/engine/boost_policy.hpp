// SPDX-License-Identifier: Apache-2.0
#pragma once
// The one Boost.Math policy, used by every call of the house, and the one place where Boost's exceptions
// become a DomainError. Results that underflow are 0; everything else that cannot be computed is an error,
// never errno or NaN.

#include <boost/math/policies/policy.hpp>
#include <optional>
#include <stdexcept>
#include <string>
#include <string_view>
#include <utility>

#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {

namespace boost_policies = boost::math::policies;

/// Errors throw; doubles are evaluated in long double inside; quantiles of discrete laws are real numbers.
using BoostPolicy =
    boost_policies::policy<boost_policies::domain_error<boost_policies::throw_on_error>,
                           boost_policies::pole_error<boost_policies::throw_on_error>,
                           boost_policies::overflow_error<boost_policies::throw_on_error>,
                           boost_policies::underflow_error<boost_policies::ignore_error>,
                           boost_policies::denorm_error<boost_policies::ignore_error>,
                           boost_policies::evaluation_error<boost_policies::throw_on_error>,
                           boost_policies::rounding_error<boost_policies::throw_on_error>,
                           boost_policies::indeterminate_result_error<boost_policies::throw_on_error>,
                           boost_policies::promote_float<false>, boost_policies::promote_double<true>,
                           boost_policies::discrete_quantile<boost_policies::real>>;

/// Calls `compute` and rethrows what Boost throws as a DomainError that names our function and argument.
/// @param value  the argument that is reported   @throws DomainError
template <class Compute>
auto with_boost(std::string_view function, std::string_view argument, double value, Compute&& compute) {
    const auto requirement = [](const std::exception& error) {
        return std::string("in the range that can be computed (") + error.what() + ")";
    };
    try {
        return std::forward<Compute>(compute)();
    } catch (const DomainError&) {
        throw;
    } catch (const std::domain_error& error) {
        throw DomainError(function, argument, std::nullopt, std::nullopt, value, requirement(error));
    } catch (const std::runtime_error& error) {  // overflow, evaluation, rounding
        throw DomainError(function, argument, std::nullopt, std::nullopt, value, requirement(error));
    }
}

}  // namespace steelyard::engine
