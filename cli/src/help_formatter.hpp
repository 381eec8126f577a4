// SPDX-License-Identifier: Apache-2.0
#pragma once
// Help texts broken to the width of a page; the option parser itself does not break lines.

#include <CLI/CLI.hpp>
#include <string>

#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {

class HelpFormatter : public CLI::Formatter {
  public:
    std::string make_option(const CLI::Option* option, bool is_positional) const override {
        const std::string name = "  " + make_option_name(option, is_positional) + make_option_opts(option);
        const std::string indent(get_column_width(), ' ');
        if (text_width(name) + 1 >= get_column_width()) {
            return name + "\n" + wrapped(make_option_desc(option), indent, indent);
        }
        return wrapped(make_option_desc(option), padded(name, get_column_width()), indent);
    }

    std::string make_subcommand(const CLI::App* command) const override {
        const std::string indent(get_column_width(), ' ');
        return wrapped(command->get_description(), padded("  " + command->get_name(), get_column_width()),
                       indent);
    }

    std::string make_description(const CLI::App* app) const override {
        return wrapped(app->get_description(), "", "") + "\n";
    }
};

}  // namespace steelyard::cli
