// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <string>
#include <string_view>
#include <vector>

#include "tonewalk/base/output_file.hpp"
#include "tonewalk/base/sheet.hpp"

namespace tonewalk {

/// JSON written piece by piece, never held as a document. Objects and lists are indented by two
/// spaces; `wrapped` lists fill lines of about 100 characters; inside `inline_object` everything
/// stands on one line. NaN and infinities become null, numbers are the shortest that read back
/// equal, bytes that are not UTF-8 are replaced.
class json_stream {
public:
    explicit json_stream(output_file& out) : out_{out} {}

    void begin_object() { begin(layout::lines, '{', '}'); }
    void begin_inline_object() { begin(layout::one_line, '{', '}'); }
    void begin_list() { begin(layout::lines, '[', ']'); }
    void begin_wrapped_list() { begin(layout::wrapped, '[', ']'); }
    void end(); ///< of the innermost; the last one ends the document with a line feed

    void key(std::string_view); ///< before a value or begin_...(), inside an object
    void value(const cell&);
    void text(std::string_view);
    void number(double);
    void whole(std::int64_t);
    void truth(bool);
    void null();

private:
    enum class layout { lines, one_line, wrapped };
    struct level {
        layout form;
        char closing;
        bool empty = true;
    };
    void begin(layout, char opening, char closing);
    void put(std::string_view);      ///< one scalar where a value belongs
    void separate(std::size_t size); ///< comma and space or line before the next member
    void new_line(std::size_t depth);
    void emit(std::string_view);

    output_file& out_;
    std::vector<level> levels_;
    std::size_t column_ = 0;
    bool after_key_ = false;
};

} // namespace tonewalk
