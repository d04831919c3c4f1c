// SPDX-License-Identifier: GPL-3.0-or-later
#include "example_person.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/random.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/model/mni_map.hpp>
#include <headwater/signal/standard_cap.hpp>

#include <fmt/core.h>

#include <cmath>
#include <stdexcept>

namespace headwater {
namespace {

double draw(RandomStream& stream, const NormalSpread& spread) {
  return spread.mean + spread.sd * stream.normal();
}

double draw(RandomStream& stream, const EvenSpread& spread) {
  return spread.from + (spread.to - spread.from) * stream.uniform();
}

Eigen::Vector3d draw_shift(RandomStream& stream, double sd_m) {
  const double x = stream.normal(), y = stream.normal(), z = stream.normal();
  return sd_m * Eigen::Vector3d(x, y, z);
}

HeadModel draw_head(const ExamplePeople& people, RandomStream& stream, double& skull_ratio) {
  HeadModel head = default_head();
  head.radii_m *= draw(stream, people.head_radius_m) / head.radii_m[head.radii_m.size() - 1];
  skull_ratio = std::exp(
      draw(stream, EvenSpread{std::log(people.skull_ratio.from), std::log(people.skull_ratio.to)}));
  head.conductivity_S_per_m[1] = head.conductivity_S_per_m[0] / skull_ratio;
  return head;
}

Eigen::Matrix3Xd draw_electrodes(const Labels& channels, double radius_m, double sd_m,
                                 RandomStream& stream) {
  Eigen::Matrix3Xd electrodes(3, static_cast<Eigen::Index>(channels.size()));
  for (Eigen::Index m = 0; m < electrodes.cols(); ++m) {
    const std::string& name = channels[static_cast<std::size_t>(m)];
    const auto direction = standard_direction(name);
    if (!direction)
      throw std::logic_error(fmt::format("example.toml: '{}' is no standard lead", name));
    electrodes.col(m) = radius_m * *direction + draw_shift(stream, sd_m);
  }
  return electrodes;
}

/// The sources of one component share latency and strength; sides differ by the person's balance.
void draw_component(const ExampleComponent& component, const ExamplePeople& people, double balance,
                    RandomStream stream, std::vector<PersonSource>& sources) {
  const double latency = component.latency_s + people.latency_sd_s * stream.normal();
  const double strength = std::exp(people.strength_sd * stream.normal());
  for (const auto& planted : component.sources) {
    PersonSource source{planted.name,
                        planted.mni_m + draw_shift(stream, people.position_sd_m),
                        planted.direction,
                        latency,
                        component.width_s,
                        strength,
                        {}};
    if (component.is_pair()) source.factor *= planted.mni_m.x() > 0 ? 1 + balance : 1 - balance;
    for (const double moment : component.moment_Am)
      source.moment_Am.push_back(moment * planted.share * source.factor);
    sources.push_back(std::move(source));
  }
}

}  // namespace

ExamplePerson draw_person(const ExampleRecipe& recipe, std::uint64_t seed, int number) {
  ExamplePerson person;
  person.name = fmt::format("sub-{:02}", number);
  const auto stream = [&](std::string_view of) {
    return RandomStream(seed, fmt::format("example {} {}", person.name, of));
  };
  const ExamplePeople& people = recipe.people;

  auto table = stream("table");
  person.age_years = static_cast<int>(std::lround(draw(table, people.age_years)));
  person.hearing_loss_dB = static_cast<int>(std::lround(draw(table, people.hearing_loss_dB)));
  auto head = stream("head");
  person.head = draw_head(people, head, person.skull_ratio);
  person.background_rms_V = draw(head, recipe.background.rms_V);
  const double balance = people.balance_sd * head.normal();

  person.channels = recipe.leads;
  person.channels.push_back(recipe.reference);
  auto electrodes = stream("electrodes");
  person.electrodes =
      draw_electrodes(person.channels, person.head_radius_m(), people.electrode_sd_m, electrodes);
  for (const auto& component : recipe.components)
    draw_component(component, people, balance, stream(component.name), person.sources);
  for (const auto& condition : recipe.conditions) {
    auto trials = stream(condition.name + " trials");
    const EvenSpread ends{condition.trials.from, condition.trials.to + 1};
    person.trials.push_back(static_cast<int>(std::floor(draw(trials, ends))));
  }
  return person;
}

Eigen::MatrixXd response_of(const ExamplePerson& person, std::size_t condition,
                            const Eigen::VectorXd& times_s) {
  const auto count = static_cast<Eigen::Index>(person.sources.size());
  Eigen::Matrix3Xd points(3, count);
  Eigen::MatrixXd moments = Eigen::MatrixXd::Zero(3 * count, times_s.size());
  for (Eigen::Index s = 0; s < count; ++s) {
    const PersonSource& source = person.sources[static_cast<std::size_t>(s)];
    points.col(s) = mni_to_head(source.mni_m, person.head_radius_m());
    const Eigen::ArrayXd from_peak = (times_s.array() - source.latency_s) / source.width_s;
    moments.middleRows(3 * s, 3) = source.moment_Am[condition] * source.direction *
                                   (-0.5 * from_peak.square()).exp().matrix().transpose();
  }
  return compute_gain(person.head, person.electrodes, points) * moments;
}

}  // namespace headwater
