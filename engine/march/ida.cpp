// SPDX-License-Identifier: MIT
#include <stdexcept>

#include "engine/march/march.h"
namespace couplet {
std::unique_ptr<March> ida_march(const Circuit&, const MarchSettings&) { throw std::runtime_error("not merged"); }
}  // namespace couplet
