// SPDX-License-Identifier: MIT
#pragma once
#include <string>
namespace couplet {
/// SHA-256 (FIPS 180-4) of the bytes, as 64 hexadecimal digits.
std::string sha256(const std::string& bytes);
}  // namespace couplet
