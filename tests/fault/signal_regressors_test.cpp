// SPDX-License-Identifier: GPL-3.0-or-later
#include "error_words.hpp"

#include <headwater/base/error.hpp>
#include <headwater/signal/regressors.hpp>

#include <gtest/gtest.h>

#include <limits>

namespace headwater {
namespace {

const Table kEvents = parse_table("onset\tpitch\tblock\n0\t4\t1\n1\tn/a\t1\n2\t0\t2\n", "e.tsv");

ObserverOptions options_for(const std::string& column) {
  ObserverOptions options;
  options.value_column = column;
  return options;
}

TEST(SignalRegressorsFault, NamesEveryMissingColumn) {
  ObserverOptions options = options_for("pich");
  options.block_columns = {"block", "session"};
  expect_error<InputError>([&] { observe(kEvents, options); },
                           {"e.tsv", "pich", "Did you mean 'pitch'", "session", "onset"});
}

TEST(SignalRegressorsFault, SaysWhereAValueIsNoNumber) {
  const Table table = parse_table("onset\tpitch\n0\t4\n1\thigh\n", "e.tsv");
  expect_error<InputError>([&] { observe(table, options_for("pitch")); },
                           {"line 3", "'pitch'", "'high'"});
}

TEST(SignalRegressorsFault, RefusesALogarithmOfZero) {
  ObserverOptions options = options_for("pitch");
  options.logarithm = true;
  expect_error<InputError>([&] { observe(kEvents, options); }, {"line 4", "logarithm"});
}

TEST(SignalRegressorsFault, RefusesASequenceWithoutValuesOrSpread) {
  expect_error<InputError>(
      [&] { observe(parse_table("v\nn/a\nn/a\n", "e.tsv"), options_for("v")); },
      {"no row has a value"});
  // 0.1 three times has a variance of rounding only.
  expect_error<InputError>(
      [&] { observe(parse_table("v\n0.1\n0.1\n0.1\n", "e.tsv"), options_for("v")); },
      {"0.1", "no spread"});
}

TEST(SignalRegressorsFault, ListsAllOptionsOutsideTheirRange) {
  ObserverOptions options = options_for("pitch");
  options.forgetting = 0;
  options.prior_weight = -1;
  options.prior_shape = std::numeric_limits<double>::quiet_NaN();
  options.prior_sd = 0;
  expect_error<ExperimentError>([&] { observe(kEvents, options); },
                                {"forgetting is 0", "weight is -1", "shape", "standard deviation"});
  options = options_for("pitch");
  options.forgetting = 1.01;
  EXPECT_THROW(observe(kEvents, options), ExperimentError);
}

TEST(SignalRegressorsFault, SuggestsARegressor) {
  const ObserverRegressors found = observe(kEvents, options_for("pitch"));
  expect_error<ExperimentError>([&] { regressor(found, "suprise"); }, {"Did you mean 'surprise'"});
}

}  // namespace
}  // namespace headwater
