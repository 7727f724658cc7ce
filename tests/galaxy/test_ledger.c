/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The ledger: moves conserve, take no more than there is, and carry mass from one galaxy to another. */
#include "galaxy/stage.h"

static void set(ew_ledger *ledger, ew_reservoir to, ew_element element, double mass) {
  ew_composition amount = {{0}};
  amount.mass[element] = mass;
  ew_ledger_move(ledger, EW_OUTSIDE, to, &amount);
}

static void move_takes_from_one_what_it_gives_to_the_other(void **state) {
  (void)state;
  ew_ledger ledger = {0};
  set(&ledger, EW_HALO_GAS, EW_HYDROGEN, 7.5);
  set(&ledger, EW_HALO_GAS, EW_IRON, 0.25);
  ew_composition amount = {{[EW_HYDROGEN] = 2.385, [EW_IRON] = 0.125}};
  ew_ledger_move(&ledger, EW_HALO_GAS, EW_DISC_GAS, &amount);
  assert_true(ledger.in[EW_HALO_GAS].mass[EW_HYDROGEN] == 7.5 - 2.385);
  assert_true(ledger.in[EW_DISC_GAS].mass[EW_HYDROGEN] == 2.385);
  assert_true(ledger.in[EW_HALO_GAS].mass[EW_IRON] == 0.125);
  assert_true(ledger.in[EW_OUTSIDE].mass[EW_HYDROGEN] == -7.5);
  assert_true(ew_ledger_mass(&ledger, EW_DISC_GAS) == 2.51);
  assert_true(ew_ledger_imbalance(&ledger) < ROUNDING);
}

/* Element by element: helium is there in full, carbon only in part, oxygen not at all. */
static void move_takes_no_more_than_there_is(void **state) {
  (void)state;
  ew_ledger ledger = {0};
  set(&ledger, EW_DISC_GAS, EW_HELIUM, 3.0);
  set(&ledger, EW_DISC_GAS, EW_CARBON, 0.5);
  ew_composition amount = {{[EW_HELIUM] = 2.0, [EW_CARBON] = 0.75, [EW_OXYGEN] = 1.0}};
  ew_ledger_move(&ledger, EW_DISC_GAS, EW_LIVING_STARS, &amount);
  assert_true(ledger.in[EW_LIVING_STARS].mass[EW_HELIUM] == 2.0);
  assert_true(ledger.in[EW_LIVING_STARS].mass[EW_CARBON] == 0.5);
  assert_true(ledger.in[EW_DISC_GAS].mass[EW_CARBON] == 0.0);
  assert_true(ledger.in[EW_LIVING_STARS].mass[EW_OXYGEN] == 0.0);
}

/* A star makes 2 Msun of oxygen out of 1.5 Msun of hydrogen and 0.5 Msun of helium. */
static void negative_amounts_are_destroyed(void **state) {
  (void)state;
  ew_ledger ledger = {0};
  set(&ledger, EW_DISC_GAS, EW_HYDROGEN, 10.0);
  set(&ledger, EW_DISC_GAS, EW_HELIUM, 0.25);
  ew_composition made = {{[EW_HYDROGEN] = -1.5, [EW_HELIUM] = -0.5, [EW_OXYGEN] = 2.0}};
  ew_ledger_move(&ledger, EW_MADE, EW_DISC_GAS, &made);
  assert_true(ledger.in[EW_DISC_GAS].mass[EW_HYDROGEN] == 8.5);
  assert_true(ledger.in[EW_MADE].mass[EW_HYDROGEN] == 1.5);
  assert_true(ledger.in[EW_DISC_GAS].mass[EW_OXYGEN] == 2.0);
  assert_true(ledger.in[EW_MADE].mass[EW_OXYGEN] == -2.0);
  assert_true(ledger.in[EW_DISC_GAS].mass[EW_HELIUM] == 0.0); /* only what the gas had */
  assert_true(ledger.in[EW_MADE].mass[EW_HELIUM] == 0.25);
  assert_true(ew_ledger_imbalance(&ledger) < ROUNDING);
}

static ew_ledger gas_of_three(void) {
  ew_ledger ledger = {0};
  set(&ledger, EW_DISC_GAS, EW_HYDROGEN, 6.0);
  set(&ledger, EW_DISC_GAS, EW_HELIUM, 2.0);
  set(&ledger, EW_DISC_GAS, EW_IRON, 0.1);
  return ledger;
}

static void shares_keep_the_composition(void **state) {
  (void)state;
  ew_ledger ledger = gas_of_three();
  ew_ledger_move_share(&ledger, EW_DISC_GAS, EW_EJECTED_GAS, 0.25);
  assert_close(ledger.in[EW_EJECTED_GAS].mass[EW_HYDROGEN], 1.5, ROUNDING);
  assert_close(ledger.in[EW_EJECTED_GAS].mass[EW_HELIUM], 0.5, ROUNDING);
  assert_close(ledger.in[EW_DISC_GAS].mass[EW_IRON], 0.075, ROUNDING);
}

static void shares_are_held_between_nothing_and_all(void **state) {
  (void)state;
  ew_ledger ledger = gas_of_three();
  ew_ledger_move_share(&ledger, EW_DISC_GAS, EW_EJECTED_GAS, -0.5);
  ew_ledger_move_share(&ledger, EW_DISC_GAS, EW_EJECTED_GAS, (double)NAN);
  assert_true(ew_ledger_mass(&ledger, EW_EJECTED_GAS) == 0.0);
  ew_ledger_move_share(&ledger, EW_DISC_GAS, EW_EJECTED_GAS, 1.0 + 1e-9);
  assert_true(ew_ledger_mass(&ledger, EW_DISC_GAS) == 0.0);
  assert_close(ew_ledger_mass(&ledger, EW_EJECTED_GAS), 8.1, ROUNDING);
  assert_true(ew_ledger_imbalance(&ledger) < ROUNDING);
}

static void masses_are_moved_in_the_mixture_at_hand(void **state) {
  (void)state;
  ew_ledger ledger = gas_of_three();
  ew_ledger_move_mass(&ledger, EW_DISC_GAS, EW_LIVING_STARS, 2.7);
  assert_close(ew_ledger_mass(&ledger, EW_LIVING_STARS), 2.7, ROUNDING);
  assert_close(ledger.in[EW_LIVING_STARS].mass[EW_HYDROGEN], 2.0, ROUNDING);
  ew_ledger_move_mass(&ledger, EW_DISC_GAS, EW_LIVING_STARS, 100.0);
  assert_close(ew_ledger_mass(&ledger, EW_LIVING_STARS), 8.1, ROUNDING);
  ew_ledger_move_mass(&ledger, EW_DISC_GAS, EW_LIVING_STARS, 1.0);
  assert_close(ew_ledger_mass(&ledger, EW_LIVING_STARS), 8.1, ROUNDING);
}

/* |-1 + 3| over |-1| + |3|; the worst element counts. */
static void imbalance_is_relative_to_the_turnover(void **state) {
  (void)state;
  ew_ledger ledger = {0};
  assert_true(ew_ledger_imbalance(&ledger) == 0.0);
  set(&ledger, EW_DISC_GAS, EW_HELIUM, 50.0);
  ledger.in[EW_OUTSIDE].mass[EW_CALCIUM] = -1.0;
  ledger.in[EW_LOST_GAS].mass[EW_CALCIUM] = 3.0;
  assert_close(ew_ledger_imbalance(&ledger), 0.5, ROUNDING);
}

static void ledgers_add_up(void **state) {
  (void)state;
  ew_ledger one = gas_of_three(), two = gas_of_three();
  ew_ledger_move_share(&two, EW_DISC_GAS, EW_LOST_GAS, 0.5);
  ew_ledger_add(&one, &two);
  assert_close(one.in[EW_DISC_GAS].mass[EW_HYDROGEN], 9.0, ROUNDING);
  assert_close(one.in[EW_LOST_GAS].mass[EW_IRON], 0.05, ROUNDING);
  assert_close(ew_ledger_mass(&one, EW_OUTSIDE), -16.2, ROUNDING);
}

static ew_reservoir any_reservoir(ew_stream *stream) {
  return (ew_reservoir)(EW_RESERVOIR_COUNT * ew_draw_uniform(stream));
}

/* Amounts of either sign, over twelve decades. */
static ew_composition any_amount(ew_stream *stream) {
  ew_composition amount;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    amount.mass[i] = (ew_draw_uniform(stream) - 0.3) * pow(10.0, 12.0 * ew_draw_uniform(stream) - 6.0);
  return amount;
}

static void assert_nothing_negative(const ew_ledger *ledger) {
  for (int r = EW_HALO_GAS; r <= EW_REMNANTS; r++)
    for (int i = 0; i < EW_ELEMENT_COUNT; i++)
      assert_true(ledger->in[r].mass[i] >= 0.0);
}

static void any_sequence_of_moves_keeps_the_balance(void **state) {
  (void)state;
  const ew_draws draws = {.seed = 3};
  ew_stream stream = ew_stream_open(&draws, EW_PROCESS_BURSTS, 1, 0);
  ew_ledger ledger = {0};
  for (int i = 0; i < 20000; i++) {
    ew_reservoir from = any_reservoir(&stream), to = any_reservoir(&stream);
    ew_composition amount = any_amount(&stream);
    ew_ledger_move(&ledger, from, to, &amount);
    from = any_reservoir(&stream);
    if (from != EW_OUTSIDE && from != EW_MADE)
      ew_ledger_move_share(&ledger, from, any_reservoir(&stream), 1.2 * ew_draw_uniform(&stream));
    assert_nothing_negative(&ledger);
  }
  assert_true(ew_ledger_imbalance(&ledger) < ROUNDING);
}

/* Halo and ejected gas go over; the satellite keeps what is in its galaxy. */
static void infall_hands_halo_gas_over(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *host = stage_galaxy_of(s, 1), *satellite = stage_galaxy_of(s, 2);
  put_gas(s, host, EW_HALO_GAS, 1e6, 0.0);
  put_gas(s, satellite, EW_HALO_GAS, 2e5, 1e-4);
  put_gas(s, satellite, EW_EJECTED_GAS, 3e4, 1e-3);
  put_gas(s, satellite, EW_DISC_GAS, 4e3, 1e-3);
  ew_galaxy_fall_in(host, satellite);
  assert_close(mass_in(host, EW_HALO_GAS), 1.2e6, ROUNDING);
  assert_close(mass_in(host, EW_EJECTED_GAS), 3e4, ROUNDING);
  assert_true(mass_in(satellite, EW_HALO_GAS) == 0.0 && mass_in(satellite, EW_EJECTED_GAS) == 0.0);
  assert_close(mass_in(satellite, EW_DISC_GAS), 4e3, ROUNDING);
  assert_close(mass_in(satellite, EW_OUTSIDE), -4e3, 1e-10);
  assert_close(ew_composition_metals(&host->ledger.in[EW_HALO_GAS]), 20.0, ROUNDING);
  assert_conserved(host);
  assert_conserved(satellite);
}

static void dissolving_hands_all_gas_over(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *host = stage_galaxy_of(s, 1), *satellite = stage_galaxy_of(s, 2);
  put_gas(s, satellite, EW_HALO_GAS, 2e5, 0.0);
  put_gas(s, satellite, EW_DISC_GAS, 4e3, 1e-3);
  put_gas(s, satellite, EW_HEATED_GAS, 5e2, 1e-3);
  put_gas(s, satellite, EW_EJECTED_GAS, 6e1, 1e-3);
  ew_galaxy_dissolve(host, satellite);
  assert_close(mass_in(host, EW_HALO_GAS), 2.045e5, ROUNDING);
  assert_close(mass_in(host, EW_EJECTED_GAS), 6e1, ROUNDING);
  assert_near(mass_in(satellite, EW_OUTSIDE), 0.0, 1e-10);
  assert_conserved(host);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(move_takes_from_one_what_it_gives_to_the_other),
      cmocka_unit_test(move_takes_no_more_than_there_is),
      cmocka_unit_test(negative_amounts_are_destroyed),
      cmocka_unit_test(shares_keep_the_composition),
      cmocka_unit_test(shares_are_held_between_nothing_and_all),
      cmocka_unit_test(masses_are_moved_in_the_mixture_at_hand),
      cmocka_unit_test(imbalance_is_relative_to_the_turnover),
      cmocka_unit_test(ledgers_add_up),
      cmocka_unit_test(any_sequence_of_moves_keeps_the_balance),
      cmocka_unit_test(infall_hands_halo_gas_over),
      cmocka_unit_test(dissolving_hands_all_gas_over),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
