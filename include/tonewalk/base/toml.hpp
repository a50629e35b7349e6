// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <memory>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/time.hpp"

namespace tonewalk {

/// One table of a TOML file, and the way to read it: ask for every key that is known, then call
/// finish(), which refuses keys that nobody asked for. Getters give nothing where the key is
/// absent; a value of another type, an infinity or NaN throws error{malformed} naming file, line,
/// key and mend. Cheap to copy; copies share what has been asked for.
class toml_table {
public:
    [[nodiscard]] bool has(std::string_view key) const;

    [[nodiscard]] std::optional<double> number(std::string_view key) const; ///< whole numbers too
    [[nodiscard]] std::optional<std::int64_t> whole(std::string_view key) const;
    [[nodiscard]] std::optional<bool> yes_no(std::string_view key) const;
    [[nodiscard]] std::optional<std::string> text(std::string_view key) const;
    [[nodiscard]] std::optional<utc_time>
    utc(std::string_view key) const; ///< date-time, or text of one
    [[nodiscard]] std::optional<std::vector<double>> numbers(std::string_view key) const;
    [[nodiscard]] std::optional<std::vector<std::string>> texts(std::string_view key) const;
    [[nodiscard]] std::optional<toml_table> table(std::string_view key) const;
    /// [[key]] blocks, in order; empty where there are none. A single [key] counts as one.
    [[nodiscard]] std::vector<toml_table> tables(std::string_view key) const;

    /// The same for keys that must be there; `example` completes the mend: "add rate_hz =
    /// 2400000.0".
    [[nodiscard]] double need_number(std::string_view key, std::string_view example) const;
    [[nodiscard]] toml_table need_table(std::string_view key) const;

    /// Every key of this table and of the tables taken from it must have been asked for by now.
    void finish() const;

    /// An error about one key's value, for rules that only the caller knows: throw
    /// table.wrong(...).
    [[nodiscard]] error wrong(std::string_view key, std::string_view what,
                              std::string_view mend) const;

    [[nodiscard]] std::vector<std::string> keys() const; ///< as they stand in the file
    [[nodiscard]] const std::filesystem::path& file() const noexcept;

    struct node; ///< private to the implementation
    explicit toml_table(std::shared_ptr<const node> root) noexcept : node_{std::move(root)} {}

private:
    std::shared_ptr<const node> node_;
};

/// Throws error{unreadable} or error{malformed} with the line.
[[nodiscard]] toml_table read_toml(const std::filesystem::path&);
/// The same from text; `name` stands in error lines and gives the folder for file names inside.
[[nodiscard]] toml_table parse_toml(std::string_view text, const std::filesystem::path& name);

} // namespace tonewalk
