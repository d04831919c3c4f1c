// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/core.h>

#include <headwater/base/version.hpp>

int main() { fmt::print("headwater {}\n{}\n", headwater::version(), headwater::caution()); }
