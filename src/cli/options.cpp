// SPDX-License-Identifier: GPL-3.0-or-later
#include "options.hpp"

#include <algorithm>
#include <thread>

#include <CLI/CLI.hpp>
#include <fmt/format.h>
#include <fmt/ranges.h>

#include "tonewalk/base/error.hpp"

namespace tonewalk::cli {
namespace {

constexpr long most_threads = 16;

std::optional<double> hz_or_nothing(const std::string& text, std::string_view option) {
    if (text.empty()) {
        return std::nullopt;
    }
    return parse_hz(text, option);
}

std::optional<double> positive_hz(const std::string& text, std::string_view option) {
    const auto hz = hz_or_nothing(text, option);
    if (hz && *hz <= 0.0) {
        throw error{fault::bad_request, "has to be above 0 Hz", fmt::format("{} {}", option, text),
                    "give a positive frequency such as 20k"};
    }
    return hz;
}

sample_format format_or_error(const std::string& text) {
    const auto format = parse_sample_format(text);
    if (!format) {
        throw error{
            fault::bad_request, "is not a sample format", fmt::format("--format {}", text),
            "give c or r, the type and its byte order, such as ci16_le, cf32_le, cu8 or ri16_le"};
    }
    return *format;
}

} // namespace

void recording_options::add_to(CLI::App& app) {
    const std::string group = "The recording";
    app.add_option("RECORDING", recording,
                   "SigMF recording or archive, two-channel (I, Q) or one-channel container, raw "
                   "file, or - "
                   "for raw samples on standard input")
        ->type_name("FILE")
        ->required();
    app.add_option("--format", format,
                   "sample format of raw samples: ci16_le, cf32_le, cu8, ri16_le ...")
        ->type_name("FORMAT")
        ->group(group);
    app.add_option("--rate", rate, "samples per second, such as 2.4M")
        ->type_name("HZ")
        ->group(group);
    app.add_option("--centre", centre, "frequency at 0 Hz of the recording, such as 145.2M")
        ->type_name("HZ")
        ->group(group);
    app.add_option("--start-utc", start_utc,
                   "time of the first sample, such as 2026-05-04T09:30:00Z")
        ->type_name("TIME")
        ->group(group);
    app.add_option("--lane", lane, "which of several interleaved streams, from 0")
        ->type_name("N")
        ->group(group);
    app.add_option("--member", member, "which recording of an archive that holds several")
        ->type_name("NAME")
        ->group(group);
    app.add_flag("--swap-iq", swap_iq, "exchange I and Q")->group(group);
    app.add_flag("--inverted", inverted, "the spectrum is mirrored")->group(group);
    app.add_option("--from", from, "start here: 12.5, 1min, 00:01:30 or a UTC time")
        ->type_name("TIME")
        ->group(group);
    app.add_option("--until", until, "stop here, given likewise")->type_name("TIME")->group(group);
    app.add_flag("--verify", verify, "check the samples against the recording's SHA-512 first")
        ->group(group);
}

recording_request recording_options::request() const {
    recording_request request;
    request.path = recording;
    if (!format.empty()) {
        request.format = format_or_error(format);
    }
    request.rate_hz = positive_hz(rate, "--rate");
    request.centre_hz = hz_or_nothing(centre, "--centre");
    if (!start_utc.empty()) {
        request.start_utc = parse_utc(start_utc);
        if (!request.start_utc) {
            throw error{fault::bad_request, "is not a UTC time",
                        fmt::format("--start-utc {}", start_utc),
                        "write it like 2026-05-04T09:30:00Z"};
        }
    }
    if (!lane.empty()) {
        request.lane = static_cast<unsigned>(parse_whole(lane, "--lane", 0, 65535));
    }
    request.member = member;
    request.swap_iq = swap_iq;
    request.inverted = inverted;
    request.verify = verify;
    if (!from.empty()) {
        request.from = parse_moment(from, "--from");
    }
    if (!until.empty()) {
        request.until = parse_moment(until, "--until");
    }
    return request;
}

void signal_options::add_to(CLI::App& app) {
    const std::string group = "The signal";
    app.add_option(
           "--carrier", carrier,
           "auto; with a sign an offset from the centre (+3.2M, -12.5k); without one a frequency "
           "(145.2M), which needs a centre")
        ->type_name("auto|HZ")
        ->group(group)
        ->capture_default_str();
    app.add_option("--tone", tone, "auto, or the test tone such as 1k")
        ->type_name("auto|HZ")
        ->group(group)
        ->capture_default_str();
    app.add_option("--width", width,
                   "flat width of the channel, both sides together; by default from the tone")
        ->type_name("HZ")
        ->group(group);
    app.add_flag("--mend-iq", mend_iq,
                 "take the receiver's image out first, fitted in the recording's opening")
        ->group("Corrections");
}

std::optional<signed_hz> signal_options::carrier_hz() const {
    if (carrier == "auto") {
        return std::nullopt;
    }
    return parse_signed_hz(carrier, "--carrier");
}

std::optional<double> signal_options::tone_hz() const {
    return tone == "auto" ? std::nullopt : positive_hz(tone, "--tone");
}

std::optional<double> signal_options::width_hz() const {
    return positive_hz(width, "--width");
}

void running_options::add_to(CLI::App& app) {
    const std::string group = "Running";
    app.add_option("--threads", threads,
                   "how many threads, 1 to 16; by default the machine's cores")
        ->type_name("N")
        ->group(group);
    app.add_option("--progress", progress, "auto (on a terminal), always or never")
        ->type_name("auto|always|never")
        ->group(group)
        ->capture_default_str();
    app.add_flag("--quiet", quiet, "hide progress and remarks; warnings and errors stay")
        ->group(group);
    app.add_flag("--force", force, "replace outputs that exist")->group(group);
}

void running_options::check() const {
    static_cast<void>(thread_count());
    static_cast<void>(progress_shown());
}

unsigned running_options::thread_count() const {
    if (threads.empty()) {
        return std::clamp(std::thread::hardware_concurrency(), 1U,
                          static_cast<unsigned>(most_threads));
    }
    return static_cast<unsigned>(parse_whole(threads, "--threads", 1, most_threads));
}

progress_choice running_options::progress_shown() const {
    constexpr progress_choice by_place[] = {progress_choice::automatic, progress_choice::always,
                                            progress_choice::never};
    const auto choice = by_place[chosen("--progress", progress, {"auto", "always", "never"})];
    return quiet ? progress_choice::never : choice;
}

void json_options::add_to(CLI::App& app) {
    const std::string group = "Outputs";
    app.add_option("--json", json, "results as JSON; - is standard output")
        ->type_name("FILE")
        ->group(group);
    app.add_option("--curves", curves, "none: leave what is drawn out of the JSON")
        ->type_name("none|all")
        ->group(group);
}

void json_options::check() const {
    if (!curves.empty()) {
        chosen("--curves", curves, {"none", "all"});
    }
}

moment_span parse_span(const std::string& text, std::string_view option) {
    // Moments hold colons themselves; written alike, both have as many.
    const auto colons = std::count(text.begin(), text.end(), ':');
    if (colons % 2 == 0) {
        throw error{fault::bad_request, "is not a part of the recording",
                    fmt::format("{} {}", option, text),
                    "write FROM:UNTIL, both alike, such as 0s:20s or 00:10:00:30"};
    }
    std::size_t middle = 0;
    for (auto k = colons / 2 + 1; k > 0; --k) {
        middle = text.find(':', middle) + 1;
    }
    return {parse_moment(text.substr(0, middle - 1), option),
            parse_moment(text.substr(middle), option)};
}

std::size_t chosen(std::string_view option, std::string_view typed,
                   const std::vector<std::string_view>& choices) {
    const auto found = std::find(choices.begin(), choices.end(), typed);
    if (found == choices.end()) {
        throw error{fault::bad_request, "is not one of its choices",
                    fmt::format("{} {}", option, typed),
                    fmt::format("give {}", fmt::join(choices, " or "))};
    }
    return static_cast<std::size_t>(found - choices.begin());
}

} // namespace tonewalk::cli
