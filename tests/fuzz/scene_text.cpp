// SPDX-License-Identifier: GPL-3.0-or-later
// TOML, read with every getter; then as a scene, whose first samples are made.
#include <array>
#include <cmath>

#include "targets.hpp"
#include "tonewalk/base/toml.hpp"
#include "tonewalk/scene/generator.hpp"
#include "tonewalk/scene/make_recording.hpp"

namespace tonewalk::fuzz {
namespace {

void read_key(const toml_table& table, const std::string& key) {
    promise(table.has(key), "a key that is listed and missing");
    (void)accepted([&] { promise(std::isfinite(table.number(key).value()), "an endless number"); });
    (void)accepted([&] { (void)table.whole(key); });
    (void)accepted([&] { (void)table.yes_no(key); });
    (void)accepted([&] { (void)table.text(key); });
    (void)accepted([&] { (void)table.utc(key); });
    (void)accepted([&] { (void)table.numbers(key); });
    (void)accepted([&] { (void)table.texts(key); });
}

void read_table(const toml_table& table) {
    for (const std::string& key : table.keys()) {
        read_key(table, key);
        (void)accepted([&] {
            for (const toml_table& inner : table.tables(key))
                read_table(inner);
        });
    }
}

void make_samples(const scene& what) {
    scene_generator generator{what};
    std::array<cf64, 16> samples{};
    const std::size_t made = generator.render(samples);
    for (const cf64& sample : std::span{samples}.first(made))
        promise(std::isfinite(sample.real()) && std::isfinite(sample.imag()),
                "a sample that is no number");
}

} // namespace

bool scene_text(input bytes) {
    const std::string_view text = text_of(bytes);
    (void)accepted([&] {
        const toml_table root = parse_toml(text, "input");
        read_table(root);
        root.finish();
    });
    return accepted([&] { make_samples(parse_scene(text, "input")); });
}

} // namespace tonewalk::fuzz
