// SPDX-License-Identifier: Apache-2.0
#pragma once
// A DomainError is checked whole: type, fields and message. A crash, another exception or no exception fails.

#include <gtest/gtest.h>

#include <cmath>
#include <optional>
#include <string>

#include "steelyard/engine/domain_error.hpp"

namespace steelyard::test {

struct Place {
    std::optional<Eigen::Index> row, column;
};

template <class Call>
void expect_domain_error(Call&& call, const std::string& function, const std::string& argument, Place place,
                         double value, const std::string& requirement) {
    const std::string what = function + "(" + argument + ")";
    try {
        call();
    } catch (const engine::DomainError& error) {
        EXPECT_EQ(error.function(), function) << what;
        EXPECT_EQ(error.argument(), argument) << what;
        EXPECT_EQ(error.row(), place.row) << what;
        EXPECT_EQ(error.column(), place.column) << what;
        if (std::isnan(value)) {
            EXPECT_TRUE(std::isnan(error.value())) << what;
        } else {
            EXPECT_DOUBLE_EQ(error.value(), value) << what;
        }
        EXPECT_EQ(error.requirement(), requirement) << what;
        const std::string message = error.what();
        EXPECT_EQ(message.find(function + ": " + argument), 0U) << message;
        EXPECT_NE(message.find(", but must be " + requirement), std::string::npos) << message;
        return;
    }
    ADD_FAILURE() << what << " threw nothing";
}

}  // namespace steelyard::test
