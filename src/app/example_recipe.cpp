// SPDX-License-Identifier: GPL-3.0-or-later
#include "example_recipe.hpp"

#include <headwater/base/embedded_file.hpp>
#include <headwater/base/toml.hpp>
#include <headwater/base/units.hpp>

#include <fmt/core.h>

#include <cmath>
#include <stdexcept>

namespace headwater {
namespace {

[[noreturn]] void refuse(const TomlValue& at, std::string_view key, std::string_view expected) {
  throw std::logic_error(fmt::format("example.toml:{}: '{}' must be {}", at.line, key, expected));
}

const TomlValue& member(const TomlValue& table, std::string_view key) {
  const TomlValue* found = table.find(key);
  if (!found) refuse(table, key, "there");
  return *found;
}

double number(const TomlValue& table, std::string_view key) {
  const TomlValue& value = member(table, key);
  if (!value.is_number()) refuse(value, key, "a number");
  return value.number();
}

int whole_number(const TomlValue& table, std::string_view key) {
  return static_cast<int>(std::lround(number(table, key)));
}

std::string text(const TomlValue& table, std::string_view key) {
  const TomlValue& value = member(table, key);
  if (!value.is_text()) refuse(value, key, "text");
  return std::get<std::string>(value.value);
}

const TomlValue::Array& list(const TomlValue& table, std::string_view key) {
  const TomlValue& value = member(table, key);
  if (!value.is_array()) refuse(value, key, "a list");
  return std::get<TomlValue::Array>(value.value);
}

Labels texts(const TomlValue& table, std::string_view key) {
  Labels result;
  for (const auto& item : list(table, key)) {
    if (!item.is_text()) refuse(item, key, "a list of texts");
    result.push_back(std::get<std::string>(item.value));
  }
  return result;
}

Eigen::Vector3d triple(const TomlValue& table, std::string_view key) {
  const auto& items = list(table, key);
  if (items.size() != 3) refuse(member(table, key), key, "three numbers");
  return {items[0].number(), items[1].number(), items[2].number()};
}

NormalSpread normal_spread(const TomlValue& table, std::string_view key, double unit = 1) {
  const TomlValue& value = member(table, key);
  return {number(value, "mean") * unit, number(value, "sd") * unit};
}

EvenSpread even_spread(const TomlValue& table, std::string_view key, double unit = 1) {
  const TomlValue& value = member(table, key);
  return {number(value, "from") * unit, number(value, "to") * unit};
}

Eigen::VectorXd read_times(const TomlValue& recording) {
  const double from = number(recording, "from_ms") * kMillisecond;
  const double to = number(recording, "to_ms") * kMillisecond;
  const double rate = number(recording, "rate_Hz");
  const auto samples = static_cast<Eigen::Index>(std::lround((to - from) * rate)) + 1;
  return Eigen::VectorXd::LinSpaced(samples, from, to);
}

ExamplePeople read_people(const TomlValue& table) {
  ExamplePeople people;
  people.count = whole_number(table, "count");
  people.age_years = normal_spread(table, "age_years");
  people.hearing_loss_dB = normal_spread(table, "hearing_loss_dB");
  people.head_radius_m = normal_spread(table, "head_radius_mm", kMillimetre);
  people.skull_ratio = even_spread(table, "skull_ratio");
  people.electrode_sd_m = number(table, "electrode_sd_mm") * kMillimetre;
  people.position_sd_m = number(table, "position_sd_mm") * kMillimetre;
  people.latency_sd_s = number(table, "latency_sd_ms") * kMillisecond;
  people.strength_sd = number(table, "strength_sd");
  people.balance_sd = number(table, "balance_sd");
  return people;
}

ExampleBackground read_background(const TomlValue& table) {
  ExampleBackground background;
  background.lattice_m = number(table, "lattice_mm") * kMillimetre;
  background.patch_m = number(table, "patch_mm") * kMillimetre;
  background.alpha_behind_m = number(table, "alpha_behind_mm") * kMillimetre;
  background.patches = whole_number(table, "patches");
  background.alpha_patches = whole_number(table, "alpha_patches");
  background.rms_V = even_spread(table, "rms_uV", kMicrovolt);
  background.alpha_share = number(table, "alpha_share");
  background.band_Hz = {number(table, "from_Hz"), number(table, "to_Hz")};
  background.alpha_Hz = normal_spread(table, "alpha_Hz");
  background.sensor_V = number(table, "sensor_uV") * kMicrovolt;
  return background;
}

ExampleRecordings read_recordings(const TomlValue& table) {
  ExampleRecordings recordings;
  recordings.people = whole_number(table, "people");
  recordings.blocks = whole_number(table, "blocks");
  recordings.beats = whole_number(table, "beats");
  recordings.interval_s = number(table, "interval_ms") * kMillisecond;
  recordings.steady_sd_s = number(table, "steady_sd_ms") * kMillisecond;
  recordings.loose_sd_s = number(table, "loose_sd_ms") * kMillisecond;
  recordings.late_share = number(table, "late_share");
  recordings.late_s = number(table, "late_ms") * kMillisecond;
  recordings.forgetting = number(table, "forgetting");
  recordings.n1_Am = number(table, "n1_nAm") * kNanoampereMetre;
  recordings.mismatch_Am = number(table, "mismatch_nAm") * kNanoampereMetre;
  recordings.mismatch_per_bit_Am = number(table, "mismatch_per_bit_nAm") * kNanoampereMetre;
  recordings.bad_person = whole_number(table, "bad_person");
  recordings.bad_lead = text(table, "bad_lead");
  recordings.bad_V = number(table, "bad_uV") * kMicrovolt;
  return recordings;
}

ExampleComponent read_component(const TomlValue& table,
                                const std::vector<ExampleCondition>& conditions) {
  ExampleComponent component;
  component.name = text(table, "name");
  component.latency_s = number(table, "latency_ms") * kMillisecond;
  component.width_s = number(table, "width_ms") * kMillisecond;
  for (const auto& condition : conditions)
    component.moment_Am.push_back(number(member(table, "moment_nAm"), condition.name) *
                                  kNanoampereMetre);
  component.shows_in = texts(table, "shows_in");
  for (const auto& source : list(table, "sources"))
    component.sources.push_back({text(source, "name"), triple(source, "mni_mm") * kMillimetre,
                                 triple(source, "direction").normalized(),
                                 number(source, "share")});
  return component;
}

}  // namespace

ExampleRecipe read_example_recipe() {
  const TomlValue document = parse_toml(embedded_file("example.toml"), "example.toml");
  const TomlValue& recording = member(document, "recording");
  ExampleRecipe recipe;
  recipe.leads = texts(recording, "leads");
  recipe.reference = text(recording, "reference");
  recipe.times_s = read_times(recording);
  recipe.people = read_people(member(document, "participants"));
  recipe.background = read_background(member(document, "background"));
  recipe.recordings = read_recordings(member(document, "recordings"));
  for (const auto& table : list(document, "conditions"))
    recipe.conditions.push_back({text(table, "name"), even_spread(table, "trials")});
  for (const auto& table : list(document, "components"))
    recipe.components.push_back(read_component(table, recipe.conditions));
  return recipe;
}

}  // namespace headwater
