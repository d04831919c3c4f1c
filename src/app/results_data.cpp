// SPDX-License-Identifier: GPL-3.0-or-later
// Tables of what was decided about a participant's data, each decision with its figure.
#include "app/results_places.hpp"
#include "app/results_tables.hpp"

#include <headwater/base/units.hpp>

#include <fmt/core.h>

#include <cmath>

namespace headwater {

OutputTable lead_table(const ParticipantData& participant) {
  OutputTable table{
      "Leads, and what speaks for or against them (bad ones included).",
      {{"name", "Lead", ""},
       {"bad", "yes: taken for bad", ""},
       {"reason", "Why", ""},
       {"deviation_z", "Robust z over leads of the logarithm of the lead's spread", ""},
       {"correlation", "Median over trials of the largest correlation with a neighbour", ""},
       {"spline_error",
        "rms difference from the spline through the others, over the prediction's rms", ""},
       {"spline_z", "Its robust z over leads (logarithm)", ""},
       {"marked_share", "Share of trials in which this lead breaks a limit", ""}},
      {}};
  for (const auto& lead : participant.leads.leads)
    table.rows.push_back({lead.channel, lead.bad ? "yes" : "no",
                          lead.reason.empty() ? "n/a" : lead.reason,
                          format_fixed(lead.deviation, 2), format_fixed(lead.correlation, 3),
                          format_fixed(lead.spline_error, 3), format_fixed(lead.spline_z, 2),
                          format_fixed(lead.marked, 3)});
  return table;
}

OutputTable trial_table(const ParticipantData& participant) {
  OutputTable table{"Events of the conditions, and what became of their epochs.",
                    {{"event", "Row of the events, from 1", ""},
                     {"onset_s", "Onset in the recording", "s"},
                     {"condition", "Condition", ""},
                     {"kept", "yes: in the average", ""},
                     {"reason", "Why not", ""},
                     {"lead", "Lead that broke the limit most", ""},
                     {"figure_uV", "Its value", "uV"}},
                    {}};
  for (const auto& predictor : participant.trials->predictors)
    table.columns.push_back({predictor.name, "Predictor, as it is before centring", ""});
  for (const auto& record : participant.trials->records) {
    table.rows.push_back(
        {std::to_string(record.event_row + 1), format_number(record.onset_s, 9), record.condition,
         record.kept ? "yes" : "no", record.reason.empty() ? "n/a" : record.reason,
         record.channel.empty() ? "n/a" : record.channel,
         record.channel.empty() ? "n/a" : format_fixed(record.figure / kMicrovolt, 1)});
    for (const auto& predictor : participant.trials->predictors)
      table.rows.back().push_back(
          format_number(predictor.of_event[static_cast<Eigen::Index>(record.event_row)], 9));
  }
  return table;
}

OutputTable regression_table(const ParticipantData& participant) {
  const auto& regression = participant.trials->regression;
  std::string about = "Predictors of the regression of single trials.";
  if (const auto& prior = participant.trials->prior; prior)
    about += fmt::format(
        " The ideal observer begins with mean {:.6g} (worth {:g} values) and standard deviation "
        "{:.6g} (worth {:g} values).",
        prior->mean, prior->weight, std::sqrt(prior->scale / prior->shape), 2 * prior->shape);
  OutputTable table{
      about,
      {{"predictor", "Predictor", ""},
       {"mean", "Mean over the trials used, before centring", ""},
       {"deviation", "Standard deviation over them: the coefficient's unit is uV for each", ""},
       {"inflation",
        "Variance inflation factor: 1 is independent of the other predictors; above 5 they can "
        "hardly "
        "be told apart",
        ""},
       {"effective_trials", "Trials of an average that would be as noisy as the coefficients", ""},
       {"trials", "Trials used", ""},
       {"degrees", "Residual degrees of freedom", ""}},
      {}};
  for (std::size_t j = 0; j < regression.names.size(); ++j) {
    const auto k = static_cast<Eigen::Index>(j);
    table.rows.push_back({regression.names[j], format_number(regression.mean[k], 6),
                          format_number(regression.deviation[k], 6),
                          format_number(regression.inflation[k], 4),
                          format_number(regression.effective_trials[k], 5),
                          std::to_string(regression.trials), std::to_string(regression.degrees)});
  }
  return table;
}

Json cap_json(const ParticipantCap& cap) {
  Json json = Json::object();
  if (!cap.fit) return json;
  Json outliers = Json::array();
  for (const auto& outlier : cap.fit->outliers) {
    Json entry = Json::object();
    entry.set("Name", outlier.name)
        .set("FromStandard_deg", outlier.angle_deg)
        .set("OffSphere_mm", outlier.off_sphere_m / kMillimetre);
    outliers.push(entry);
  }
  json.set("FittedBy", cap.fit->method)
      .set("SphereRadius_mm", cap.fit->sphere.radius / kMillimetre)
      .set("SphereRms_mm", cap.fit->sphere.rms / kMillimetre)
      .set("FromStandardRms_deg", cap.fit->angle_rms_deg)
      .set("NamesAgainstLandmarks_deg", cap.fit->landmark_angle_deg)
      .set("Outliers", outliers)
      .set("Notes", cap.notes);
  return json;
}

}  // namespace headwater
