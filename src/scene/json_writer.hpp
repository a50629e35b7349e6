// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <string_view>

namespace tonewalk {

/// Builds the text of a JSON document piece by piece; the caller may take what is there at any
/// time, so that long series are never held as text. Numbers are shortest round-trip; NaN and
/// infinities are null.
class json_writer {
public:
    json_writer& begin_object(std::string_view key = {});
    json_writer& begin_array(std::string_view key = {});
    json_writer& end(); ///< the innermost object or array
    json_writer& number(std::string_view key, double value);
    json_writer& number(std::string_view key, std::optional<double> value);
    json_writer& whole(std::string_view key, std::int64_t value);
    json_writer& yes_no(std::string_view key, bool value);
    json_writer& text(std::string_view key, std::string_view value);
    json_writer& null(std::string_view key);
    json_writer& element(double value); ///< of an array, on the same line

    [[nodiscard]] std::string take(); ///< the text since the last take
    [[nodiscard]] std::size_t pending() const noexcept { return text_.size(); }

private:
    void place(std::string_view key);
    void put_number(double value);

    std::string text_, closers_; ///< closers_: what ends the open objects and arrays
    bool first_ = true;          ///< nothing yet in the innermost one
};

} // namespace tonewalk
