// SPDX-License-Identifier: GPL-3.0-or-later
// Inside, everything is SI: m, S/m, A m, V, s. Files, tables, options and pictures use mm, uV, ms
// and nA m, with the unit in the name. These factors are the only bridge: value_SI = x * kUnit.
#pragma once

namespace headwater {

inline constexpr double kMillimetre = 1e-3;
inline constexpr double kMillisecond = 1e-3;
inline constexpr double kMicrovolt = 1e-6;
inline constexpr double kMillivolt = 1e-3;
inline constexpr double kNanoampereMetre = 1e-9;
inline constexpr double kPi = 3.14159265358979323846;

}  // namespace headwater
