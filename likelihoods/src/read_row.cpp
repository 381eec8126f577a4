// SPDX-License-Identifier: Apache-2.0
// One row of evidence: exactly one form, its numbers checked, its words kept.
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <array>
#include <cmath>
#include <numeric>

#include "given_row.hpp"

namespace steelyard::likelihoods::detail {

using document::Code;
using document::Diagnostics;
using document::Node;
using document::StrictMap;

namespace {

constexpr double most_patients = 1e9;
constexpr double share_tolerance = 0.005;

/// The keys of a row, each asked for once.
struct RowKeys {
    const Node *counts, *share, *worth, *mean, *sd, *sem, *n, *scale, *ratio, *ratio_to_rest, *range,
        *against, *joint;

    explicit RowKeys(StrictMap& map)
        : counts(map.optional("counts")),
          share(map.optional("share")),
          worth(map.optional("worth")),
          mean(map.optional("mean")),
          sd(map.optional("sd")),
          sem(map.optional("sem")),
          n(map.optional("n")),
          scale(map.optional("scale")),
          ratio(map.optional("ratio")),
          ratio_to_rest(map.optional("ratio_to_rest")),
          range(map.optional("range")),
          against(map.optional("against")),
          joint(map.optional("joint")) {}
};

std::string written(const Node& list) {
    std::vector<std::string_view> texts;
    for (const Node& item : list.items) {
        texts.emplace_back(item.text);
    }
    return fmt::format("{}", fmt::join(texts, ", "));
}

class RowReader {
  public:
    RowReader(const Node& node, StrictMap& map, const TableFile& file, const SetNames& names,
              Diagnostics& faults)
        : node_(node), map_(map), file_(file), names_(names), faults_(faults), keys_(map) {}

    void read(GivenRow& given) {
        const std::array<std::pair<const Node*, RowForm>, 6> forms = {
            {{keys_.counts, RowForm::counts},
             {keys_.share, RowForm::share},
             {keys_.mean, RowForm::summary},
             {keys_.ratio, RowForm::ratio},
             {keys_.ratio_to_rest, RowForm::ratio_to_rest},
             {keys_.joint, RowForm::joint}}};
        const Node* chosen = nullptr;
        int found = 0;
        for (const auto& [value, form] : forms) {
            if (value != nullptr) {
                ++found;
                chosen = value;
                given.row.form = form;
            }
        }
        if (found != 1) {
            faults_.add(
                node_.where(), Code::row_form,
                fmt::format("{} has {} of the forms in which evidence is given, but must have exactly one",
                            map_.what(), found == 0 ? "none" : "more than one"),
                "counts; share and worth; mean, sd or sem, and n; ratio and against; ratio_to_rest; or "
                "joint");
            return;
        }
        given.numbers_at = chosen->where();
        refuse_strays(given.row.form);
        if (!form_fits(given.row.form, *chosen) || !file_.bands_known) {
            return;
        }
        switch (given.row.form) {
            case RowForm::counts:
                read_counts(given);
                break;
            case RowForm::share:
                read_share(given);
                break;
            case RowForm::summary:
                read_summary(given);
                break;
            case RowForm::ratio:
                read_ratios(*keys_.ratio, "ratio", given);
                read_against(given);
                break;
            case RowForm::ratio_to_rest:
                read_ratios(*keys_.ratio_to_rest, "ratio_to_rest", given);
                break;
            case RowForm::joint:
                read_joint(given);
                break;
        }
    }

  private:
    std::size_t bands() const { return file_.table.band_names.size(); }

    /// Keys that belong to another form.
    void refuse_strays(RowForm form) {
        const auto refuse = [&](const Node* value, std::string_view key, std::string_view with, bool fits) {
            if (value != nullptr && !fits) {
                faults_.add(value->where(), Code::row_form,
                            fmt::format("{} does not go with this form of row", map_.name(key)),
                            fmt::format("{} goes with {}", key, with));
            }
        };
        const bool summary = form == RowForm::summary;
        refuse(keys_.worth, "worth", "share", form == RowForm::share);
        refuse(keys_.sd, "sd", "mean", summary);
        refuse(keys_.sem, "sem", "mean", summary);
        refuse(keys_.n, "n", "mean", summary);
        refuse(keys_.scale, "scale", "mean", summary);
        refuse(keys_.range, "range", "ratio and ratio_to_rest",
               form == RowForm::ratio || form == RowForm::ratio_to_rest);
        refuse(keys_.against, "against", "ratio", form == RowForm::ratio);
    }

    /// Whether this form can describe this kind of finding.
    bool form_fits(RowForm form, const Node& value) {
        const bool joint_table = file_.table.kind == FindingKind::joint;
        if (joint_table != (form == RowForm::joint)) {
            faults_.add(value.where(), Code::row_form,
                        joint_table
                            ? fmt::format("{}: rows of a joint table have the form joint", map_.what())
                            : fmt::format("{}: the form joint needs a table with joint_of", map_.what()));
            return false;
        }
        if (form == RowForm::summary && file_.table.kind == FindingKind::feature) {
            faults_.add(value.where(), Code::row_form,
                        fmt::format("{}: a feature has levels and cannot have a mean", map_.what()),
                        "give counts, or share and worth");
            return false;
        }
        return true;
    }

    bool check_band_count(const Node& value, std::string_view what, std::size_t found) {
        if (found == bands()) {
            return true;
        }
        faults_.add(value.where(), Code::band_count,
                    fmt::format("{} has {} entries, but there are {} bands", what, found, bands()),
                    fmt::format("the bands are: {}", fmt::join(file_.table.band_names, "; ")));
        return false;
    }

    /// Whole numbers of patients, not all zero.
    std::optional<std::vector<double>> read_patients(const Node& list, std::string_view what) {
        const std::size_t before = faults_.size();
        std::optional<std::vector<double>> counts =
            document::read_numbers(list, what, faults_, 0.0, most_patients);
        if (!counts || faults_.size() != before) {
            return std::nullopt;
        }
        for (std::size_t i = 0; i < counts->size(); ++i) {
            if ((*counts)[i] != std::floor((*counts)[i])) {
                faults_.add(list.items[i].where(), Code::out_of_range,
                            fmt::format("{}: {} is no whole number of patients", what, list.items[i].text),
                            "proportions are given as share, with worth");
                return std::nullopt;
            }
        }
        return counts;
    }

    void read_counts(GivenRow& given) {
        const std::string what = map_.name("counts");
        const std::optional<std::vector<double>> counts = read_patients(*keys_.counts, what);
        if (!counts || !check_band_count(*keys_.counts, what, counts->size())) {
            return;
        }
        const double total = std::accumulate(counts->begin(), counts->end(), 0.0);
        if (total == 0.0) {
            faults_.add(keys_.counts->where(), Code::band_sum,
                        fmt::format("{} counts no patient at all", what));
            return;
        }
        given.numbers = *counts;
        given.row.effective_patients = total;
        given.row.as_given = fmt::format("counts {}", written(*keys_.counts));
        given.whole = true;
    }

    void read_share(GivenRow& given) {
        const std::string what = map_.name("share");
        const std::size_t before = faults_.size();
        const std::optional<std::vector<double>> share =
            document::read_numbers(*keys_.share, what, faults_, 0.0, 1.0);
        const std::optional<double> worth = map_.required_number("worth", 0.0, most_patients);
        if (worth && !(*worth > 0.0)) {
            faults_.add(keys_.worth->where(), Code::out_of_range,
                        fmt::format("{} must be above 0", map_.name("worth")));
        }
        if (!share || faults_.size() != before || !check_band_count(*keys_.share, what, share->size()) ||
            !check_no_zero(*keys_.share, what, *share)) {
            return;
        }
        const double total = std::accumulate(share->begin(), share->end(), 0.0);
        // The guard against rounding lets a sum of exactly 1.005 pass.
        if (!(std::abs(total - 1.0) <= share_tolerance + 1e-12)) {
            faults_.add(
                keys_.share->where(), Code::band_sum,
                fmt::format("{} sums to {:.6g}, but must be 1 within {}", what, total, share_tolerance));
            return;
        }
        given.numbers = *share;
        given.worth = *worth;
        given.row.effective_patients = *worth;
        given.row.as_given =
            fmt::format("share {}, worth {} patients", written(*keys_.share), keys_.worth->text);
        given.whole = true;
    }

    bool check_no_zero(const Node& list, std::string_view what, const std::vector<double>& values) {
        bool fine = true;
        for (std::size_t i = 0; i < values.size(); ++i) {
            if (values[i] == 0.0) {
                faults_.add(list.items[i].where(), Code::band_zero,
                            fmt::format("{}: a hard zero is refused", what),
                            "no band is impossible; give a small share, or counts, where 0 is allowed");
                fine = false;
            }
        }
        return fine;
    }

    void read_summary(GivenRow& given) {
        constexpr std::array<std::string_view, 2> scales = {"linear", "log"};
        constexpr double most_log_sd = 5.0;  // a spread of e^5 = 148-fold either way: a slip, not a study
        const std::size_t before = faults_.size();
        const std::string what = map_.name("mean");
        const QuantityRange& quantity = *file_.quantity;
        const bool log =
            keys_.scale != nullptr &&
            document::read_choice(*keys_.scale, map_.name("scale"), scales, faults_).value_or("") == "log";
        const std::optional<double> mean = document::read_number(*keys_.mean, what, faults_);
        const std::optional<double> n = map_.required_number("n", 2.0, most_patients);
        const Node* spread_node = keys_.sd != nullptr ? keys_.sd : keys_.sem;
        const std::string spread_what = map_.name(keys_.sd != nullptr ? "sd" : "sem");
        std::optional<double> spread;
        if (keys_.sd != nullptr && keys_.sem != nullptr) {
            faults_.add(keys_.sem->where(), Code::conflicting_keys,
                        fmt::format("{} has both sd and sem", map_.what()),
                        "give the one that the source prints");
        } else if (spread_node == nullptr) {
            faults_.add(node_.where(), Code::missing_key,
                        fmt::format("{} has a mean but neither sd nor sem", map_.what()));
        } else {
            spread = document::read_number(*spread_node, spread_what, faults_, 0.0);
        }
        if (!mean || !n || !spread || faults_.size() != before) {
            return;
        }
        const double sd = keys_.sd != nullptr ? *spread : *spread * std::sqrt(*n);
        const double factor = file_.unit_factor;
        given.scale = log ? engine::Scale::log : engine::Scale::linear;
        given.mean = log ? *mean + std::log(factor) : *mean * factor;
        given.sd = log ? sd : sd * factor;
        given.n = *n;
        const double centre = log ? std::exp(given.mean) : given.mean;
        if (!(quantity.low <= centre && centre <= quantity.high)) {
            faults_.add(keys_.mean->where(), Code::implausible_value,
                        fmt::format("{} means {:.6g} {}, outside the plausible range {:.6g} to {:.6g} of {}",
                                    what, centre, quantity.unit, quantity.low, quantity.high, quantity.title),
                        log ? "on scale log, mean and sd are of the natural logarithm of the value"
                            : "check the number and the unit of the table");
        }
        if (!(given.sd > 0.0)) {
            faults_.add(spread_node->where(), Code::out_of_range,
                        fmt::format("{} must be above 0", spread_what));
        } else if (given.sd > (log ? most_log_sd : quantity.high - quantity.low)) {
            faults_.add(
                spread_node->where(), Code::implausible_value,
                fmt::format("{} is wider than the whole plausible range of {}", spread_what, quantity.title));
        }
        if (log && file_.table.edges.front() <= 0.0) {
            faults_.add(keys_.scale->where(), Code::bad_edges,
                        fmt::format("{}: scale log needs edges above 0", map_.what()));
        }
        if (faults_.size() != before) {
            return;
        }
        given.row.effective_patients = *n;
        given.row.as_given =
            fmt::format("{}mean {}, {} {}, n {}{}", log ? "natural log: " : "", keys_.mean->text,
                        keys_.sd != nullptr ? "SD" : "SEM", spread_node->text, keys_.n->text,
                        file_.unit_as_written.empty() ? "" : " (in " + file_.unit_as_written + ")");
        given.whole = true;
    }

    void read_ratios(const Node& list, std::string_view key, GivenRow& given) {
        const std::size_t before = faults_.size();
        const std::string what = map_.name(key);
        const std::optional<std::vector<double>> ratios = document::read_numbers(list, what, faults_, 0.0);
        if (!ratios || faults_.size() != before || !check_band_count(list, what, ratios->size()) ||
            !check_no_zero(list, what, *ratios)) {
            return;
        }
        given.numbers = *ratios;
        given.log_sd.assign(ratios->size(), 0.0);
        for (const double ratio : *ratios) {
            given.row.published.push_back({ratio, ratio, ratio});
        }
        std::vector<std::string> words;
        for (const Node& item : list.items) {
            words.push_back(item.text);
        }
        if (keys_.range != nullptr) {
            read_ranges(*keys_.range, words, given);
        }
        given.row.as_given =
            fmt::format("{} {}", key == "ratio" ? "ratio" : "ratio to the rest", fmt::join(words, ", "));
        given.whole = faults_.size() == before;
    }

    /// 95 % intervals: the standard deviation of ln ratio is ln(high / low) / (2 * 1.959964).
    void read_ranges(const Node& list, std::vector<std::string>& words, GivenRow& given) {
        constexpr double normal_975 = 1.959963984540054;
        const std::string what = map_.name("range");
        const std::span<const Node> ranges = items_of(list, what, faults_);
        if (list.kind != document::Kind::sequence || !check_band_count(list, what, ranges.size())) {
            return;
        }
        for (std::size_t i = 0; i < ranges.size(); ++i) {
            const std::optional<std::vector<double>> ends =
                document::read_numbers(ranges[i], what, faults_, 0.0);
            if (!ends) {
                continue;
            }
            if (ends->size() != 2 ||
                !(0.0 < (*ends)[0] && (*ends)[0] <= given.numbers[i] && given.numbers[i] <= (*ends)[1])) {
                faults_.add(
                    ranges[i].where(), Code::bad_interval,
                    fmt::format("{}: each range must be [low, high] with the ratio {} between, all above 0",
                                what, words[i]));
                continue;
            }
            given.row.published[i] = {given.numbers[i], (*ends)[0], (*ends)[1]};
            given.log_sd[i] = std::log((*ends)[1] / (*ends)[0]) / (2.0 * normal_975);
            words[i] += fmt::format(" ({} to {})", ranges[i].items[0].text, ranges[i].items[1].text);
        }
    }

    void read_against(GivenRow& given) {
        given.whole = false;
        const Node* against = map_.required("against");
        if (against == nullptr) {
            return;
        }
        given.against_at = against->where();
        const std::optional<std::string> cause =
            document::read_identifier(*against, map_.name("against"), faults_);
        if (!cause) {
            return;
        }
        if (contains(names_.composites, *cause)) {
            faults_.add(
                against->where(), Code::unknown_cause,
                fmt::format("{}: {} is a composite and has no row of its own", map_.name("against"), *cause));
            return;
        }
        if (!names_.single_causes.empty() && !contains(names_.single_causes, *cause)) {
            faults_.add(against->where(), Code::unknown_cause,
                        fmt::format("{}: {} is no cause of this set", map_.name("against"), *cause),
                        name_hint(*cause, names_.single_causes));
            return;
        }
        given.row.against = *cause;
        std::string title = *cause;
        for (std::size_t i = 0; i < names_.single_causes.size(); ++i) {
            title = names_.single_causes[i] == *cause ? names_.cause_titles[i] : title;
        }
        given.row.as_given += fmt::format(", against {}", title);
        given.whole = !given.numbers.empty();
    }

    void read_joint(GivenRow& given) {
        const std::string what = map_.name("joint");
        const std::size_t first = file_.table.joint_names[0].size();
        const std::size_t second = file_.table.joint_names[1].size();
        const std::span<const Node> lists = items_of(*keys_.joint, what, faults_);
        if (keys_.joint->kind != document::Kind::sequence) {
            return;
        }
        if (lists.size() != first) {
            faults_.add(keys_.joint->where(), Code::band_count,
                        fmt::format("{} has {} lists, but {} has {} bands", what, lists.size(),
                                    file_.table.joint_of[0], first));
            return;
        }
        std::vector<std::string> words;
        std::vector<double> cells;
        for (const Node& list : lists) {
            const std::optional<std::vector<double>> counts = read_patients(list, what);
            if (!counts) {
                return;
            }
            if (counts->size() != second) {
                faults_.add(list.where(), Code::band_count,
                            fmt::format("{} has a list of {} entries, but {} has {} bands", what,
                                        counts->size(), file_.table.joint_of[1], second));
                return;
            }
            cells.insert(cells.end(), counts->begin(), counts->end());
            words.push_back(written(list));
        }
        const double total = std::accumulate(cells.begin(), cells.end(), 0.0);
        if (total == 0.0) {
            faults_.add(keys_.joint->where(), Code::band_sum,
                        fmt::format("{} counts no patient at all", what));
            return;
        }
        given.numbers = std::move(cells);
        given.row.effective_patients = total;
        given.row.as_given = fmt::format("joint counts {}", fmt::join(words, " / "));
        given.whole = true;
    }

    const Node& node_;
    StrictMap& map_;
    const TableFile& file_;
    const SetNames& names_;
    Diagnostics& faults_;
    RowKeys keys_;
};

}  // namespace

GivenRow read_row(const Node& node, const std::string& cause, const TableFile& file, const SetNames& names,
                  Diagnostics& faults) {
    GivenRow given;
    given.row.cause = cause;
    given.row.where = node.where();
    StrictMap map(node, "rows." + cause, faults);
    if (!map.usable()) {
        return given;
    }
    RowReader(node, map, file, names, faults).read(given);
    const std::optional<document::Grounds> grounds =
        document::read_grounds(map, file.table.sources, false, faults);
    given.row.grounds = grounds.value_or(document::Grounds{});
    given.whole = given.whole && grounds;
    given.row.note = map.optional_text("note").value_or("");
    map.finish();
    return given;
}

}  // namespace steelyard::likelihoods::detail
