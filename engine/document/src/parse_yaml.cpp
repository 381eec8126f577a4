// SPDX-License-Identifier: Apache-2.0
// YAML by yaml-cpp's event parser. Its Node loader is not used: it drops text after the first document, keeps
// duplicate keys, forgets where aliases and empty values stood, and never returns on some one-byte texts.
#include <yaml-cpp/eventhandler.h>
#include <yaml-cpp/exceptions.h>
#include <yaml-cpp/mark.h>
#include <yaml-cpp/node/node.h>  // defines what parser.h only declares
#include <yaml-cpp/parser.h>

#include <algorithm>
#include <array>
#include <istream>
#include <streambuf>
#include <string>

#include "tree_builder.hpp"

namespace steelyard::document::detail {

namespace {
/// Thrown by the handler to leave the parser once a fault makes going on pointless.
struct Stop {};

/// Reads a text where it stands, without a copy.
class TextBuffer : public std::streambuf {
  public:
    explicit TextBuffer(std::string_view text) {
        char* begin = const_cast<char*>(text.data());  // NOLINT: the get area is never written to
        setg(begin, begin, begin + text.size());
    }
};

/// yaml-cpp counts from 0, in bytes. What is missed at the end of the text is placed behind its last
/// character.
Place place_of(const YAML::Mark& mark, std::string_view text) {
    if (static_cast<std::size_t>(std::max(mark.pos, 0)) < text.size()) {
        return {mark.line + 1, mark.column + 1};
    }
    text = text.substr(0, text.find_last_not_of(" \t\r\n") + 1);
    const std::size_t last_end = text.rfind('\n');
    const std::size_t start = last_end == std::string_view::npos ? 0 : last_end + 1;
    return {static_cast<int>(std::count(text.begin(), text.end(), '\n')) + 1,
            static_cast<int>(text.size() - start) + 1};
}

constexpr std::string_view alias_hint = "write the value out in full where it is needed";

class Recorder : public YAML::EventHandler {
  public:
    Recorder(std::string_view text, TreeBuilder& tree) : text_(text), tree_(tree) {}

    /// The second document's events must not reach the tree.
    void refuse_more() { refusing_ = true; }
    bool refused() const { return refused_; }

    void OnDocumentStart(const YAML::Mark& mark) override {
        if (!refusing_) {
            return;
        }
        refused_ = true;
        if (rest_of(mark).starts_with("---") || after_document_end(mark)) {
            tree_.fault(place(mark), Code::second_document, "a second document begins here",
                        "each file holds one document; put the second in a file of its own");
        } else {
            tree_.fault(place(mark), Code::syntax, "this text follows the end of the document's value",
                        "check the indentation, and quote texts that begin with a comma, bracket or brace");
        }
        throw Stop{};
    }
    void OnDocumentEnd() override {}

    void OnNull(const YAML::Mark& mark, YAML::anchor_t anchor) override {
        refuse_properties(mark, {}, anchor);
        // yaml-cpp does not say how the null was written, and marks one that was left out at whatever follows
        // it.
        const std::string_view written = null_word(mark);
        if (tree_.expects_key()) {
            if (written.empty()) {
                syntax(mark, "a key is missing here", "a text that begins with `:` or `?` needs quotes");
            }
            go_on(tree_.key(std::string(written), place(mark)));
            return;
        }
        Place at = place(mark);
        if (written.empty()) {
            at = tree_.pending_key().value_or(tree_.in_sequence() ? place_of_empty_item(mark) : at);
        }
        go_on(tree_.scalar(std::string(written), false, at));
    }

    void OnAlias(const YAML::Mark& mark, YAML::anchor_t /*anchor*/) override {
        tree_.fault(place(mark), Code::alias, "aliases (`*name`) are not read", std::string(alias_hint));
        tree_.spoil();
        go_on(tree_.expects_key() ? tree_.key("*", place(mark)) : tree_.scalar({}, false, place(mark)));
    }

    void OnScalar(const YAML::Mark& mark, const std::string& tag, YAML::anchor_t anchor,
                  const std::string& value) override {
        refuse_properties(mark, tag, anchor);
        refuse_open_quote(mark);
        const bool quoted = tag != "?";
        if (!tree_.expects_key()) {
            go_on(tree_.scalar(value, quoted, place(mark)));
            return;
        }
        if (value == "<<" && !quoted) {
            tree_.fault(place(mark), Code::merge_key, "merge keys (`<<`) are not read",
                        std::string(alias_hint));
            tree_.spoil();
        }
        go_on(tree_.key(value, place(mark)));
    }

    void OnSequenceStart(const YAML::Mark& mark, const std::string& tag, YAML::anchor_t anchor,
                         YAML::EmitterStyle::value /*style*/) override {
        begin(Kind::sequence, mark, tag, anchor);
    }
    void OnSequenceEnd() override { tree_.end(); }

    void OnMapStart(const YAML::Mark& mark, const std::string& tag, YAML::anchor_t anchor,
                    YAML::EmitterStyle::value /*style*/) override {
        begin(Kind::mapping, mark, tag, anchor);
    }
    void OnMapEnd() override { tree_.end(); }

  private:
    void begin(Kind kind, const YAML::Mark& mark, const std::string& tag, YAML::anchor_t anchor) {
        refuse_properties(mark, tag, anchor);
        if (tree_.expects_key()) {
            if (is_open_bracket(mark)) {
                // yaml-cpp takes a bracket that nothing closes for the start of a key.
                syntax(mark, "a bracket or brace that begins here is not closed",
                       "close it; a text that begins with a bracket or brace needs quotes");
            }
            tree_.fault(place(mark), Code::wrong_type,
                        "a key must be a single text, not a list or a mapping");
            tree_.spoil();
            throw Stop{};
        }
        go_on(tree_.begin(kind, place(mark)));
    }

    static void go_on(bool possible) {
        if (!possible) {
            throw Stop{};
        }
    }

    [[noreturn]] void syntax(const YAML::Mark& mark, std::string message, std::string hint) {
        tree_.fault(place(mark), Code::syntax, std::move(message), std::move(hint));
        tree_.spoil();
        throw Stop{};
    }

    /// Anchors and tags stand before the value, at its mark. yaml-cpp gives plain values the tag `?` and
    /// quoted ones `!`, but `!` also stands for a bare `!` in the text, so the text decides.
    void refuse_properties(const YAML::Mark& mark, std::string_view tag, YAML::anchor_t anchor) {
        if (anchor != 0) {
            tree_.fault(place(mark), Code::anchor, "anchors (`&name`) are not read",
                        "take the anchor away; a text that begins with `&` needs quotes");
        }
        const bool bare = tag.empty() || tag == "?" || tag == "!";
        if (!bare || rest_of(mark).starts_with('!')) {
            tree_.fault(place(mark), Code::tag, "tags (`!name`) are not read",
                        "take the tag away; a text that begins with `!` needs quotes");
        }
    }

    /// yaml-cpp takes a quote that the end of the text closes for closed.
    void refuse_open_quote(const YAML::Mark& mark) {
        const std::string_view rest = rest_of(mark);
        if (rest.empty() || (rest.front() != '"' && rest.front() != '\'')) {
            return;
        }
        const bool escapes = rest.front() == '"';
        for (std::size_t at = 1; at < rest.size(); ++at) {
            const bool escaped = escapes ? rest[at] == '\\' : rest.substr(at).starts_with("''");
            if (escaped) {
                ++at;
            } else if (rest[at] == rest.front()) {
                return;
            }
        }
        syntax(mark, "a quote that begins here is not closed",
               escapes ? "add the closing quote"
                       : "add the closing quote; inside single quotes write '' for an apostrophe");
    }

    bool is_open_bracket(const YAML::Mark& mark) const {
        int open = 0;
        for (const char c : rest_of(mark)) {
            if (c == '[' || c == '{') {
                ++open;
            } else if (c == ']' || c == '}') {
                --open;
            }
            if (open == 0) {
                return false;  // closed, or no bracket at all
            }
        }
        return true;
    }

    Place place(const YAML::Mark& mark) const { return place_of(mark, text_); }

    std::string_view rest_of(const YAML::Mark& mark) const {
        return text_.substr(std::min(text_.size(), static_cast<std::size_t>(std::max(mark.pos, 0))));
    }

    /// The word at a mark if it is one of YAML's for null, or empty.
    std::string_view null_word(const YAML::Mark& mark) const {
        const std::string_view rest = rest_of(mark);
        for (const std::string_view word : {"~", "null", "Null", "NULL"}) {
            if (rest.starts_with(word) &&
                (rest.size() == word.size() ||
                 std::string_view(" \t\r\n,]}:").find(rest[word.size()]) != std::string_view::npos)) {
                return word;
            }
        }
        return {};
    }

    /// Whether the last line before the mark that is neither blank nor a comment is the document end `...`.
    bool after_document_end(const YAML::Mark& mark) const {
        std::string_view before = text_.substr(0, text_.size() - rest_of(mark).size());
        while (!before.empty()) {
            const std::string_view line = last_line(before);
            before.remove_suffix(line.size());
            if (!is_blank(line)) {
                return line.starts_with("...");
            }
            if (!before.empty()) {
                before.remove_suffix(1);
            }
        }
        return false;
    }

    /// An item left out in a block sequence is marked at the next item; its own dash ends the last line
    /// before that which is neither blank nor a comment.
    Place place_of_empty_item(const YAML::Mark& mark) const {
        const std::string_view rest = rest_of(mark);
        if (!rest.empty() && std::string_view(",]}").find(rest.front()) != std::string_view::npos) {
            return place(mark);  // left out between brackets, where the mark is right
        }
        std::string_view before = text_.substr(0, text_.size() - rest.size());
        const bool past_added_end = static_cast<std::size_t>(std::max(mark.pos, 0)) > text_.size();
        int line = mark.line + (past_added_end ? 0 : 1);
        while (!before.empty()) {
            const std::string_view content = without_comment(last_line(before));
            if (!is_blank(content)) {
                const std::size_t last = content.find_last_not_of(" \t\r");
                return content[last] == '-' ? Place{line, static_cast<int>(last) + 1} : place(mark);
            }
            before.remove_suffix(last_line(before).size());
            if (!before.empty()) {
                before.remove_suffix(1);
                --line;
            }
        }
        return place(mark);
    }

    static std::string_view last_line(std::string_view text) {
        const std::size_t end = text.rfind('\n');
        return end == std::string_view::npos ? text : text.substr(end + 1);
    }
    static bool is_blank(std::string_view line) {
        const std::size_t first = line.find_first_not_of(" \t\r");
        return first == std::string_view::npos || line[first] == '#';
    }
    static std::string_view without_comment(std::string_view line) {
        for (std::size_t at = line.find('#'); at != std::string_view::npos; at = line.find('#', at + 1)) {
            if (at == 0 || line[at - 1] == ' ' || line[at - 1] == '\t') {
                return line.substr(0, at);
            }
        }
        return line;
    }

    std::string_view text_;
    TreeBuilder& tree_;
    bool refusing_ = false;
    bool refused_ = false;
};

/// yaml-cpp's message, and ours with what to do about it.
struct Advice {
    std::string_view theirs, message, hint;
};

constexpr std::string_view indent_hint =
    "check the indentation of this line and of those before it, and that quotes are closed";
constexpr std::string_view escape_hint =
    "double the backslash, or use single quotes, in which it has no meaning";

const std::array advice = std::to_array<Advice>({
    {YAML::ErrorMsg::END_OF_MAP, "this does not continue the mapping", indent_hint},
    {YAML::ErrorMsg::END_OF_SEQ, "this does not continue the list", indent_hint},
    {YAML::ErrorMsg::END_OF_MAP_FLOW, "a mapping in braces is not closed before this",
     "a comma or a closing brace is missing; texts with a comma, bracket, brace or `: ` need quotes inside "
     "braces"},
    {YAML::ErrorMsg::END_OF_SEQ_FLOW, "a list in brackets is not closed before this",
     "a comma or a closing bracket is missing; texts with a comma, bracket, brace or `: ` need quotes inside "
     "brackets"},
    {YAML::ErrorMsg::FLOW_END, "this closing bracket or brace has no opening one",
     "a text that begins with a bracket or brace needs quotes"},
    {YAML::ErrorMsg::BLOCK_ENTRY, "a list item cannot begin here", "put each `- ` on a line of its own"},
    {YAML::ErrorMsg::MAP_KEY, "a key cannot begin here", indent_hint},
    {YAML::ErrorMsg::MAP_VALUE, "a value cannot begin here",
     "a text that holds `: ` needs quotes, and each key a line of its own"},
    {YAML::ErrorMsg::TAB_IN_INDENTATION, "a tab stands in the indentation", "indent with blanks only"},
    {YAML::ErrorMsg::EOF_IN_SCALAR, "a quote is not closed before the end of the text",
     "add the closing quote; inside single quotes write '' for an apostrophe"},
    {YAML::ErrorMsg::DOC_IN_SCALAR, "a quote is not closed before this document mark",
     "add the closing quote"},
    {YAML::ErrorMsg::CHAR_IN_SCALAR, "this character cannot stand in a text without quotes",
     "quote the text"},
    {YAML::ErrorMsg::UNKNOWN_TOKEN, "a text cannot begin with this character", "quote the text"},
    {YAML::ErrorMsg::INVALID_ESCAPE, "this backslash escape does not exist", escape_hint},
    {YAML::ErrorMsg::INVALID_HEX, "this backslash escape needs hexadecimal digits", escape_hint},
    {YAML::ErrorMsg::INVALID_UNICODE, "this backslash escape is no character", escape_hint},
    {YAML::ErrorMsg::CHAR_IN_BLOCK, "this cannot follow `|` or `>`",
     "begin the text on the next line, indented"},
    {YAML::ErrorMsg::ZERO_INDENT_IN_BLOCK, "the indentation after `|` or `>` cannot be 0", ""},
});

/// The place of a tab in the indentation of a line, which yaml-cpp meets with some other complaint.
std::optional<Place> indenting_tab(std::string_view text, Place place) {
    std::size_t begin = 0;
    for (int line = 1; line < place.line && begin < text.size(); ++line) {
        begin = std::min(text.find('\n', begin), text.size() - 1) + 1;
    }
    const std::size_t end = std::min(text.find_first_not_of(" \t", begin), text.size());
    const std::size_t tab = text.find('\t', begin);
    return tab < end ? std::optional(Place{place.line, static_cast<int>(tab - begin) + 1}) : std::nullopt;
}

void add_exception(const YAML::Exception& error, std::string_view text, TreeBuilder& tree) {
    Place place = error.mark.is_null() ? Place{1, 1} : place_of(error.mark, text);
    std::string_view theirs = error.msg;
    if (const std::optional<Place> tab = indenting_tab(text, place)) {
        place = *tab;
        theirs = YAML::ErrorMsg::TAB_IN_INDENTATION;
    } else if (theirs.starts_with(YAML::ErrorMsg::INVALID_ESCAPE)) {
        place.column = std::max(place.column - 2, 1);  // the mark is behind the backslash and the letter
    }
    if (theirs.starts_with(YAML::ErrorMsg::UNKNOWN_ANCHOR) || theirs == YAML::ErrorMsg::ALIAS_NOT_FOUND ||
        theirs == YAML::ErrorMsg::ALIAS_CONTENT || theirs == YAML::ErrorMsg::CHAR_IN_ALIAS) {
        tree.fault(place, Code::alias, "aliases (`*name`) are not read",
                   "write the value out in full; a text that begins with `*` needs quotes");
    } else if (theirs == YAML::ErrorMsg::ANCHOR_NOT_FOUND || theirs == YAML::ErrorMsg::CHAR_IN_ANCHOR ||
               theirs == YAML::ErrorMsg::MULTIPLE_ANCHORS) {
        tree.fault(place, Code::anchor, "anchors (`&name`) are not read",
                   "a text that begins with `&` needs quotes");
    } else if (theirs == YAML::ErrorMsg::MULTIPLE_TAGS || theirs == YAML::ErrorMsg::CHAR_IN_TAG_HANDLE ||
               theirs == YAML::ErrorMsg::TAG_WITH_NO_SUFFIX ||
               theirs == YAML::ErrorMsg::END_OF_VERBATIM_TAG) {
        tree.fault(place, Code::tag, "tags (`!name`) are not read",
                   "a text that begins with `!` needs quotes");
    } else {
        const auto* const found = std::find_if(advice.begin(), advice.end(), [theirs](const Advice& entry) {
            return theirs.starts_with(entry.theirs);
        });
        if (found != advice.end()) {
            tree.fault(place, Code::syntax, std::string(found->message), std::string(found->hint));
        } else {
            tree.fault(place, Code::syntax, "the text is not well-formed YAML: " + error.msg);
        }
    }
    tree.spoil();
}

/// What yaml-cpp must not see, found in one look over the text.
///
/// `%YAML` and `%TAG` lines change how the rest is read, and unknown directives are skipped silently wherever
/// they are. Brackets far beyond any limit on depth cost yaml-cpp some hundred bytes each before it reports
/// the first.
bool refuse_early(std::string_view text, TreeBuilder& tree) {
    constexpr int most_open = 1000;
    int open = 0, line = 1;
    std::size_t line_start = 0;
    for (std::size_t at = 0; at < text.size(); ++at) {
        const char c = text[at];
        if (c == '\n') {
            ++line;
            line_start = at + 1;
        } else if (c == '%' && at == line_start) {
            tree.fault({line, 1}, Code::syntax, "a line that begins with `%` is not read",
                       "take the line away, or quote the text");
            return true;
        } else if (c == '[' || c == '{') {
            ++open;
        } else if ((c == ']' || c == '}') && open > 0) {
            --open;
        }
        if (open > most_open) {
            tree.fault({line, static_cast<int>(at - line_start) + 1}, Code::too_deep,
                       "more than 1000 brackets and braces are open here");
            return true;
        }
    }
    return false;
}
}  // namespace

bool parse_yaml(std::string_view text, TreeBuilder& tree) {
    if (refuse_early(text, tree)) {
        tree.spoil();
        return false;
    }
    Recorder recorder(text, tree);
    try {
        // Without a line end at its end yaml-cpp places what is missing there on line 1 and unclosed quotes
        // at the end.
        const std::string ended = text.ends_with('\n') ? std::string() : std::string(text) + '\n';
        TextBuffer buffer(ended.empty() ? text : std::string_view(ended));
        std::istream in(&buffer);
        YAML::Parser parser(in);
        if (!parser.HandleNextDocument(recorder)) {
            tree.fault({1, 1}, Code::empty_document, "the text holds no value");
            tree.spoil();
            return false;
        }
        // A second call must find nothing: whatever is left is a second document or text that belongs
        // nowhere.
        recorder.refuse_more();
        parser.HandleNextDocument(recorder);
    } catch (const Stop&) {
        tree.spoil();
        return false;
    } catch (const YAML::Exception& error) {
        add_exception(error, text, tree);
        return false;
    }
    return true;
}

}  // namespace steelyard::document::detail
