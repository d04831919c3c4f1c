// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/results_places.hpp"
#include "app/results_tables.hpp"

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

OutputTable empty_table(const std::vector<PowerIndex>& indices) {
  OutputTable table{
      "What becomes of the answer of each window when one lead, one block of trials or (of the "
      "mean) "
      "one participant is left out; the first row of a window is the answer with all. Leads are "
      "left "
      "out exactly, with the regularisation kept.",
      {{"window", "Latency window", ""},
       {"left_out", "nothing, lead, trials or participant", ""},
       {"name", "Which", ""},
       {"x_mm", "MNI coordinate of the answer then, to the right", "mm"},
       {"y_mm", "MNI coordinate, forwards", "mm"},
       {"z_mm", "MNI coordinate, upwards", "mm"},
       {"side", "left, right or midline", ""},
       {"gyrus", "Gyrus", ""},
       {"lobe", "Lobe", ""},
       {"shift_mm", "Distance from the answer with all", "mm"},
       {"misfit",
        "How much worse than the median lead this one is predicted by the others (rms of its "
        "deleted "
        "residual in model deviations); n/a: not a lead",
        ""},
       {"carries", "yes: carries more than its share of the answer", ""}},
      {}};
  for (const auto& index : indices)
    table.columns.push_back({file_label(index.name), "Index " + index.name + " then", ""});
  return table;
}

void append_window(OutputTable& table, const ForwardModel& forward, const std::string& window,
                   const WindowInfluence& influence) {
  const auto add = [&](const std::string& kind, const std::string& name, Eigen::Index point,
                       double shift_m, double misfit, bool carries) {
    const Eigen::Vector3d at = forward.grid.mni_m.col(point);
    const Place place = place_of(forward, point);
    table.rows.push_back({window, kind, name, mm(at.x()), mm(at.y()), mm(at.z()), place.side,
                          place.gyrus, place.lobe, mm(shift_m), format_number(misfit, 3),
                          carries ? "yes" : "no"});
  };
  const auto add_indices = [&](const auto& values) {
    for (const double value : values) table.rows.back().push_back(format_fixed(value, 3));
  };
  add("nothing", "n/a", influence.point, 0, std::nan(""), false);
  std::vector<double> with_all;
  for (const auto& index : influence.indices) with_all.push_back(index.value);
  add_indices(with_all);
  // Those that move the answer most first, kind by kind; whatever the order of the channels.
  std::vector<LeftOut> sorted = influence.left_out;
  std::stable_sort(sorted.begin(), sorted.end(), [](const LeftOut& a, const LeftOut& b) {
    if (a.kind != b.kind) return a.kind < b.kind;
    const std::string first = mm(a.shift_m), second = mm(b.shift_m);
    return first != second ? a.shift_m > b.shift_m : a.name < b.name;
  });
  for (const auto& without : sorted) {
    add(without.kind, without.name, without.point, without.shift_m, without.misfit,
        find_label(influence.carriers, without.kind + " " + without.name).has_value());
    add_indices(without.indices);
  }
}

}  // namespace

OutputTable influence_table(const ForwardModel& forward,
                            const std::vector<WindowDipoles>& dipoles) {
  OutputTable table = empty_table({});
  for (const auto& window : dipoles)
    append_window(table, forward, window.window.name, window.influence);
  return table;
}

OutputTable influence_table(const ForwardModel& forward, const LocatedContrast& located) {
  OutputTable table = empty_table(located.windows.empty() ? std::vector<PowerIndex>{}
                                                          : located.windows[0].influence.indices);
  for (const auto& window : located.windows)
    append_window(table, forward, window.window.name, window.influence);
  return table;
}

}  // namespace headwater
