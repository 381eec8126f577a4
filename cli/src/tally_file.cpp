// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/tally_file.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <nlohmann/json.hpp>
#include <unordered_map>

#include "steelyard/cli/output.hpp"

namespace steelyard::cli {
namespace {

using Json = nlohmann::ordered_json;

Json head_json(const Tally& tally) {
    const TallyHead& head = tally.head();
    const TallyFlow flow = tally.flow();
    Json json = {{"format", "steelyard.tally/1"},
                 {"versions", head.versions},
                 {"tables", {{"title", head.tables_title}, {"digest", head.tables_digest}}},
                 {"reading", head.reading_digest},
                 {"causes", head.causes}};
    json["findings"] = Json::array();
    for (const TalliedFinding& finding : head.findings) {
        json["findings"].push_back({{"id", finding.id}, {"states", finding.states}});
    }
    json["by"] = head.by;
    json["over"] = head.months ? "month" : "none";
    json["least_cell"] = head.least_cell;
    json["lost"] = {{"cells", tally.lost().cells}, {"patients", tally.lost().patients}};
    json["flow"] = {{"read", flow.read},
                    {"weighed", flow.weighed},
                    {"out_of_scope", flow.out_of_scope},
                    {"set_aside", flow.set_aside},
                    {"diagnosed", flow.diagnosed},
                    {"outside", flow.outside},
                    {"undiagnosed", flow.undiagnosed}};
    json["out_of_scope"] = Json::array();
    for (const auto& [cause, patients] : tally.out_of_scope()) {
        json["out_of_scope"].push_back({{"final_cause", cause}, {"patients", patients}});
    }
    json["cells"] = tally.cells();
    return json;
}

/// Words of a tally as JSON strings, each made once.
class QuotedWords {
  public:
    const std::string& of(std::string_view word) {
        const auto found = quoted_.find(std::string(word));
        return found != quoted_.end() ? found->second
                                      : quoted_.emplace(word, Json(word).dump()).first->second;
    }

  private:
    std::unordered_map<std::string, std::string> quoted_;
};

}  // namespace

bool looks_like_tally(std::string_view beginning) noexcept {
    return beginning.starts_with(R"({"format":"steelyard.tally/)");
}

void write_tally(const Tally& tally, const std::function<void(std::string_view)>& write) {
    constexpr std::size_t piece = std::size_t{1} << 16U;
    std::string text = head_json(tally).dump() + '\n';
    std::vector<int> states;
    for (const TalliedFinding& finding : tally.head().findings) {
        states.push_back(finding.states);
    }
    QuotedWords quoted;
    tally.for_each([&](const TallyCell& cell) {
        fmt::format_to(std::back_inserter(text), "[\"{}\",\"{}\",{},{},\"{}\",{}]\n",
                       likelihoods::code_in_characters(states, cell.code), likelihoods::to_string(cell.gate),
                       quoted.of(cell.cause), quoted.of(cell.stratum), cell.month, cell.patients);
        if (text.size() >= piece) {
            write(text);
            text.clear();
        }
    });
    write(text);
}

std::string tally_text(const Tally& tally) {
    std::string text;
    write_tally(tally, [&](std::string_view piece) { text += piece; });
    return text;
}

void save_tally(const Tally& tally, const std::string& path) {
    write_whole(path, tally_text(tally));
}

}  // namespace steelyard::cli
