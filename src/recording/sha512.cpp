// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/recording/sha512.hpp"

#include <array>
#include <new>
#include <stdexcept>

#include <fmt/format.h>
#include <fmt/ranges.h>
#include <openssl/evp.h>

namespace tonewalk {
namespace {

// The library fails here only when it is broken or out of memory: no fault of the user's.
void expect_done(int status) {
    if (status != 1)
        throw std::runtime_error{"the SHA-512 of the crypto library failed"};
}

} // namespace

struct sha512_hash::context {
    context() : evp{EVP_MD_CTX_new()} {
        if (!evp)
            throw std::bad_alloc{};
        start();
    }
    context(const context&) = delete;
    context& operator=(const context&) = delete;
    ~context() { EVP_MD_CTX_free(evp); }
    void start() { expect_done(EVP_DigestInit_ex(evp, EVP_sha512(), nullptr)); }

    EVP_MD_CTX* evp;
};

sha512_hash::sha512_hash() : context_{std::make_unique<context>()} {}
sha512_hash::sha512_hash(sha512_hash&&) noexcept = default;
sha512_hash& sha512_hash::operator=(sha512_hash&&) noexcept = default;
sha512_hash::~sha512_hash() = default;

void sha512_hash::add(std::span<const std::byte> bytes) {
    expect_done(EVP_DigestUpdate(context_->evp, bytes.data(), bytes.size()));
}

std::string sha512_hash::finish() {
    std::array<unsigned char, EVP_MAX_MD_SIZE> digest{};
    unsigned size = 0;
    expect_done(EVP_DigestFinal_ex(context_->evp, digest.data(), &size));
    context_->start();
    return fmt::format("{:02x}", fmt::join(digest.data(), digest.data() + size, ""));
}

} // namespace tonewalk
