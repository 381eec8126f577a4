// SPDX-License-Identifier: Apache-2.0
// JSON by nlohmann's event parser, which checks the text and decodes strings but gives no positions: a cursor
// follows the text in step with the events, and so knows where each token begins and how a number was
// written.
#include <algorithm>
#include <nlohmann/json.hpp>
#include <string>

#include "tree_builder.hpp"

namespace steelyard::document::detail {

namespace {
/// Walks over the tokens of a text that the parser has already found well-formed.
class Cursor {
  public:
    explicit Cursor(std::string_view text) : text_(text) {}

    /// Goes to the start of the next token and says where that is.
    Place next() {
        while (at_ < text_.size() &&
               std::string_view(" \t\r\n,:").find(text_[at_]) != std::string_view::npos) {
            if (text_[at_] == '\n') {
                ++line_;
                line_start_ = at_ + 1;
            }
            ++at_;
        }
        return place(at_);
    }

    void skip(std::size_t bytes) { at_ = std::min(at_ + bytes, text_.size()); }

    /// Past a string; strings hold no line ends.
    void skip_string() {
        skip(1);
        while (at_ < text_.size() && text_[at_] != '"') {
            at_ += text_[at_] == '\\' ? 2U : 1U;
        }
        skip(1);
    }

    /// Past a number, true, false or null: no further than JSON's grammar goes, so that in `07` the next
    /// token is `7`.
    std::string_view word() {
        const std::size_t begin = at_;
        if (at_ < text_.size() && text_[at_] >= 'a' && text_[at_] <= 'z') {
            skip(text_[at_] == 'f' ? 5 : 4);
            return text_.substr(begin, at_ - begin);
        }
        skip_if("-");
        if (!skip_if("0")) {
            skip_digits();
        }
        if (skip_if(".")) {
            skip_digits();
        }
        if (skip_if("eE")) {
            skip_if("+-");
            skip_digits();
        }
        return text_.substr(begin, at_ - begin);
    }

    /// The place of a byte at or after the cursor.
    Place place(std::size_t offset) const {
        int line = line_;
        std::size_t start = line_start_;
        for (std::size_t i = at_; i < offset; ++i) {
            if (text_[i] == '\n') {
                ++line;
                start = i + 1;
            }
        }
        return {line, static_cast<int>(offset - start) + 1};
    }

    /// Where the token after the next separator begins; without the separator, where the next token begins.
    std::size_t offset_after(char separator) const {
        std::size_t at = after_blanks(at_);
        if (separator != none && at < text_.size() && text_[at] == separator) {
            at = after_blanks(at + 1);
        }
        // What is missing at the end of the text is placed behind its last character.
        return at < text_.size() ? at : text_.find_last_not_of(" \t\r\n") + 1;
    }

    static constexpr char none = '\0';

  private:
    bool skip_if(std::string_view any) {
        const bool there = at_ < text_.size() && any.find(text_[at_]) != std::string_view::npos;
        at_ += there ? 1U : 0U;
        return there;
    }
    void skip_digits() {
        while (skip_if("0123456789")) {
        }
    }
    std::size_t after_blanks(std::size_t at) const {
        return std::min(text_.find_first_not_of(" \t\r\n", at), text_.size());
    }

    std::string_view text_;
    std::size_t at_ = 0, line_start_ = 0;
    int line_ = 1;
};

using Json = nlohmann::json;

class Recorder : public nlohmann::json_sax<Json> {
  public:
    Recorder(std::string_view text, TreeBuilder& tree) : text_(text), cursor_(text), tree_(tree) {}

    bool null() override { return word(); }
    bool boolean(bool /*value*/) override { return word(); }
    bool number_integer(number_integer_t /*value*/) override { return word(); }
    bool number_unsigned(number_unsigned_t /*value*/) override { return word(); }
    bool number_float(number_float_t /*value*/, const string_t& /*written*/) override { return word(); }
    bool binary(binary_t& /*value*/) override { return false; }  // JSON text has none

    bool string(string_t& value) override {
        const Place place = cursor_.next();
        cursor_.skip_string();
        separator_ = ',';
        return tree_.scalar(std::move(value), true, place);
    }
    bool key(string_t& value) override {
        const Place place = cursor_.next();
        cursor_.skip_string();
        separator_ = ':';
        return tree_.key(std::move(value), place);
    }
    bool start_object(std::size_t /*size*/) override { return begin(Kind::mapping); }
    bool start_array(std::size_t /*size*/) override { return begin(Kind::sequence); }
    bool end_object() override { return end(); }
    bool end_array() override { return end(); }

    bool parse_error(std::size_t /*position*/, const std::string& /*last_token*/,
                     const Json::exception& error) override {
        // The parser's own position is where it stopped reading, inside or after the token at fault, and its
        // text of that token may begin too early. What stands next in the text is the token at fault.
        const std::size_t at = cursor_.offset_after(separator_);
        constexpr int number_overflow = 406;
        if (error.id == number_overflow) {
            const Place place = cursor_.next();
            tree_.fault(place, Code::out_of_range,
                        "the number " + std::string(cursor_.word()) + " is too large");
        } else if (tree_.complete()) {
            refuse_rest(at);
        } else {
            tree_.fault(cursor_.place(at), Code::syntax,
                        "the text is not well-formed JSON: " + reason(error.what()), hint_for(at));
        }
        tree_.spoil();
        return false;
    }

  private:
    bool word() {
        const Place place = cursor_.next();
        separator_ = ',';
        return tree_.scalar(std::string(cursor_.word()), false, place);
    }
    bool begin(Kind kind) {
        const Place place = cursor_.next();
        cursor_.skip(1);
        separator_ = Cursor::none;
        return tree_.begin(kind, place);
    }
    bool end() {
        cursor_.next();
        cursor_.skip(1);
        separator_ = ',';
        tree_.end();
        return true;
    }

    /// Something follows the value.
    void refuse_rest(std::size_t at) {
        if (at < text_.size() && (text_[at] == '{' || text_[at] == '[')) {
            tree_.fault(cursor_.place(at), Code::second_document, "a second document begins here",
                        "each file holds one document; put the second in a file of its own");
            return;
        }
        tree_.fault(cursor_.place(at), Code::syntax, "this text follows the end of the document's value");
    }

    /// The useful part of the library's sentence: `... - invalid literal; last read: '1x'; expected ...`.
    static std::string reason(std::string_view sentence) {
        const std::size_t dash = sentence.find(" - ");
        std::string_view part = dash == std::string_view::npos ? sentence : sentence.substr(dash + 3);
        const std::size_t token = part.find("; last read: '");
        std::string text(part.substr(0, token));
        const std::size_t expected = part.rfind("; expected ");
        if (token != std::string_view::npos && expected != std::string_view::npos && expected > token) {
            text += part.substr(expected);
        }
        return text;
    }

    std::string hint_for(std::size_t at) const {
        const char c = at < text_.size() ? text_[at] : '\0';
        if (c == '\'') {
            return "JSON has double quotes only";
        }
        if (c == '#' || c == '/') {
            return "JSON has no comments";
        }
        const std::size_t before = text_.substr(0, at).find_last_not_of(" \t\r\n");
        if ((c == '}' || c == ']') && before != std::string_view::npos && text_[before] == ',') {
            return "a comma before a closing bracket or brace is not allowed";
        }
        if (at >= text_.size()) {
            return "a closing bracket, brace or quote is missing";
        }
        return {};
    }

    std::string_view text_;
    Cursor cursor_;
    TreeBuilder& tree_;
    char separator_ = Cursor::none;  ///< what must come before the next token
};
}  // namespace

bool parse_json(std::string_view text, TreeBuilder& tree) {
    Recorder recorder(text, tree);
    return Json::sax_parse(text.begin(), text.end(), &recorder);
}

}  // namespace steelyard::document::detail
