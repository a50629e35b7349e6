// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "progress.hpp"
#include "tonewalk/base/quantity.hpp"
#include "tonewalk/recording/stream.hpp"

namespace CLI { // NOLINT(readability-identifier-naming)
class App;
}

namespace tonewalk::cli {

/// Options arrive as text, as typed; the functions below turn them into values through
/// base/quantity, so that every number is read the same way and every complaint names its option.

/// Which recording, and what it does not say of itself.
struct recording_options {
    std::string recording, format, rate, centre, start_utc, lane, member, from, until;
    bool swap_iq = false, inverted = false, verify = false;
    void add_to(CLI::App&);
    [[nodiscard]] recording_request request() const;
};

/// Which signal in it.
struct signal_options {
    std::string carrier = "auto", tone = "auto", width;
    bool mend_iq = false;
    void add_to(CLI::App&);
    [[nodiscard]] std::optional<signed_hz> carrier_hz() const; ///< nothing: auto
    [[nodiscard]] std::optional<double> tone_hz() const;       ///< nothing: auto
    [[nodiscard]] std::optional<double> width_hz() const;      ///< nothing: from the tone
};

/// How to run, and how much to say.
struct running_options {
    std::string threads, progress = "auto";
    bool quiet = false, force = false;
    void add_to(CLI::App&);
    void check() const; ///< throws error{bad_request}, before any file is opened
    [[nodiscard]] unsigned thread_count() const; ///< 1 to 16; the machine's cores when not given
    [[nodiscard]] progress_choice progress_shown() const;
};

/// JSON, and what it holds.
struct json_options {
    std::string json, curves;
    void add_to(CLI::App&);
    void check() const; ///< likewise
    [[nodiscard]] bool with_curves() const { return curves != "none"; }
};

/// A part of a recording, FROM:UNTIL, both ends written alike. Throws error{bad_request}.
struct moment_span {
    moment from, until;
};
[[nodiscard]] moment_span parse_span(const std::string& text, std::string_view option);

/// One of `choices`, else error{bad_request} that lists them.
std::size_t chosen(std::string_view option, std::string_view typed,
                   const std::vector<std::string_view>& choices);

} // namespace tonewalk::cli
