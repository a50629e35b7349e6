// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <memory>
#include <span>
#include <string>

namespace tonewalk {

/// SHA-512 of a stream of bytes (FIPS 180-4), however it is cut.
class sha512_hash {
public:
    sha512_hash();
    sha512_hash(sha512_hash&&) noexcept;
    sha512_hash& operator=(sha512_hash&&) noexcept;
    ~sha512_hash();

    void add(std::span<const std::byte> bytes);
    /// 128 lower-case hex digits of all bytes so far; the hash then starts anew.
    [[nodiscard]] std::string finish();

private:
    struct context;
    std::unique_ptr<context> context_;
};

} // namespace tonewalk
