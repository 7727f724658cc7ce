/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Response of stars to gas that comes and goes: the textbook limits without dark matter, a cusp by hand, and energy and
 * adiabatic invariants inside a halo. */
#include "galaxy/stage.h"

#define SOLVED 1e-6 /* relative: how well the new radius is solved for */

/* A few stars of that half-mass radius [kpc] around a gas disc that is small against it, or inside one that is wide:
 * the disc's own is 1.67835 / sqrt(2) * spin * 20 kpc. */
static ew_galaxy *stars_in_gas(stage *s, double halo_mass, double radius, double spin) {
  s->environment.halo = (ew_nfw){.mass = halo_mass, .radius = 20.0, .concentration = 10.0};
  ew_galaxy *galaxy = stage_galaxy(s);
  galaxy->luck.spin = spin;
  put_gas(s, galaxy, EW_DISC_GAS, 1e8, 0.0);
  put_stars(s, galaxy, 1e-6, 0.0);
  galaxy->born_here->radius = radius;
  return galaxy;
}

#define COMPACT 1e-6 /* spin of a disc that acts as a point */
#define WIDE    0.035

typedef enum { SLOW, FAST } speed;

static void change_gas(stage *s, ew_galaxy *galaxy, double factor, speed how) {
  ew_ledger *ledger = &galaxy->ledger;
  if (factor < 1.0)
    ew_ledger_move_share(ledger, EW_DISC_GAS, EW_EJECTED_GAS, 1.0 - factor);
  else
    put_gas(s, galaxy, EW_DISC_GAS, (factor - 1.0) * mass_in(galaxy, EW_DISC_GAS), 0.0);
  ew_step step = stage_step(s, galaxy);
  if (how == SLOW)
    ew_respond_slowly(&step);
  else
    ew_respond_fast(&step);
}

/* Factor by which the stars expand when that share of the gas is left. */
static double expansion(stage *s, double halo_mass, double left, speed how) {
  ew_galaxy *galaxy = stars_in_gas(s, halo_mass, 0.5, COMPACT);
  change_gas(s, galaxy, left, how);
  return ew_half_mass_radius(galaxy) / 0.5;
}

#define NO_HALO 1e-9 /* Msun */

/* Hills 1980, ApJ 235, 986: 1/e for slow and e/(2e - 1) for sudden loss. */
static void textbook_limits_without_dark_matter(void **state) {
  stage *s = stage_fresh(state);
  assert_close(expansion(s, NO_HALO, 0.8, SLOW), 1.25, SOLVED);
  assert_close(expansion(s, NO_HALO, 1.0 / 6.0, SLOW), 6.0, SOLVED);
  assert_close(expansion(s, NO_HALO, 4.0, SLOW), 0.25, SOLVED);
  assert_close(expansion(s, NO_HALO, 0.8, FAST), 4.0 / 3.0, SOLVED);
  assert_close(expansion(s, NO_HALO, 0.6, FAST), 3.0, SOLVED);
}

/* Half of the mass or more lost at once sets stars free: they are laid down far out, not at infinity. */
static void unbound_stars_are_laid_down_far_out(void **state) {
  stage *s = stage_fresh(state);
  double farthest = expansion(s, NO_HALO, 0.5, FAST);
  assert_true(farthest > 15.0 && farthest < 30.0);
  assert_close(expansion(s, NO_HALO, 0.1, FAST), farthest, SOLVED);
}

/* In a cusp, where the dark mass goes as r^2: gas of five times the dark mass inside r is lost slowly (e = 1/6). Then
 * r^3 grows by 6, r by 6^(1/3) = 1.817, not 6 as without a halo. */
static void cusps_hold_their_stars(void **state) {
  stage *s = stage_fresh(state);
  const double radius = 0.01, scale_radius = 2.0;
  ew_galaxy *galaxy = stars_in_gas(s, 1e9, radius, COMPACT);
  double dark = ew_nfw_mass(&s->environment.halo, radius);
  galaxy->response_gas = 5.0 * dark;
  change_gas(s, galaxy, 0.0, SLOW);
  assert_close(ew_half_mass_radius(galaxy) / radius, cbrt(6.0), 2.0 * radius / scale_radius);
}

static void dark_matter_weakens_the_response(void **state) {
  stage *s = stage_fresh(state);
  for (int how = SLOW; how <= FAST; how++) {
    double last = 100.0;
    for (double halo_mass = 1e7; halo_mass < 1e12; halo_mass *= 10.0) {
      double now = expansion(s, halo_mass, 0.3, (speed)how);
      assert_true(now >= 1.0 && now <= last);
      last = now;
    }
    assert_true(last < 1.05);
  }
  for (double left = 0.2; left < 0.9; left += 0.1)
    assert_true(expansion(s, 1e9, left, FAST) > expansion(s, 1e9, left, SLOW));
}

/* Slow: r M(<r). Fast: kinetic energy at the moment of loss against the new potential, in the end a circular orbit. Gas
 * is a Plummer sphere. */
static void invariants_hold_inside_a_halo(void **state) {
  stage *s = stage_fresh(state);
  const ew_nfw *halo = &s->environment.halo;
  const double r0 = 0.5, left = 0.4;
  for (int how = SLOW; how <= FAST; how++) {
    ew_galaxy *galaxy = stars_in_gas(s, 1e9, r0, WIDE);
    double disc = ew_disc_half_mass_radius(galaxy, &s->environment), scale = disc / EW_HALF_MASS_RATIO;
    change_gas(s, galaxy, left, (speed)how);
    double r1 = ew_half_mass_radius(galaxy);
    assert_true(r1 > 1.02 * r0);
    double m0 = ew_nfw_mass(halo, r0) + 1e8 * ew_plummer_share(r0, disc);
    double m1 = ew_nfw_mass(halo, r1) + left * 1e8 * ew_plummer_share(r1, disc);
    if (how == SLOW) {
      assert_close(r1 * m1, r0 * m0, 1e-6);
      continue;
    }
    double phi0 = ew_nfw_potential(halo, r0) - EW_GRAVITY * left * 1e8 / hypot(r0, scale);
    double phi1 = ew_nfw_potential(halo, r1) - EW_GRAVITY * left * 1e8 / hypot(r1, scale);
    assert_close(EW_GRAVITY * m1 / (2.0 * r1) + phi1, EW_GRAVITY * m0 / (2.0 * r0) + phi0, 1e-6);
  }
}

/* Gas that goes and comes back ten times: without a trace if both is slow; stars end up wider if it goes fast. */
static void slow_changes_are_reversible(void **state) {
  stage *s = stage_fresh(state);
  for (int how = SLOW; how <= FAST; how++)
    for (double radius = 0.1; radius < 2.0; radius *= 2.0) {
      ew_galaxy *galaxy = stars_in_gas(s, 3e8, radius, WIDE);
      for (int i = 0; i < 10; i++) {
        change_gas(s, galaxy, 0.2, (speed)how);
        change_gas(s, galaxy, 5.0, SLOW);
      }
      if (how == SLOW)
        assert_close(ew_half_mass_radius(galaxy), radius, 1e-5);
      else
        assert_true(ew_half_mass_radius(galaxy) > 1.005 * radius);
    }
}

static void response_can_be_switched_off(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.sizes.gas_response = false;
  assert_true(expansion(s, NO_HALO, 0.3, SLOW) == 1.0);
  assert_true(expansion(s, NO_HALO, 0.3, FAST) == 1.0);
}

/* Changes of less than two per cent wait; together they count as one: 0.985^4 = 0.9413 left. */
static void small_changes_add_up(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stars_in_gas(s, NO_HALO, 0.5, COMPACT);
  change_gas(s, galaxy, 0.985, SLOW);
  assert_true(ew_half_mass_radius(galaxy) == 0.5);
  for (int i = 0; i < 3; i++)
    change_gas(s, galaxy, 0.985, SLOW);
  double now = ew_half_mass_radius(galaxy);
  assert_true(now > 0.5 * pow(0.985, -3.0) * (1.0 - 0.002) && now < 0.5 * pow(0.985, -4.0) * (1.0 + 0.002));
}

/* Gas that turns into stars stays where it was. */
static void star_formation_moves_no_stars(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stars_in_gas(s, NO_HALO, 0.5, WIDE);
  galaxy->born_here->radius = ew_disc_half_mass_radius(galaxy, &s->environment);
  double before = ew_half_mass_radius(galaxy);
  ew_ledger_move_share(&galaxy->ledger, EW_DISC_GAS, EW_OUTSIDE, 0.5);
  put_stars(s, galaxy, 5e7, 0.0);
  ew_step step = stage_step(s, galaxy);
  ew_respond_slowly(&step);
  ew_respond_fast(&step);
  assert_close(ew_half_mass_radius(galaxy), before, SOLVED);
}

/* Stars that lose half of their mass to the far outside, without gas: twice as wide. */
static void stars_respond_to_their_own_loss(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stars_in_gas(s, NO_HALO, 0.5, COMPACT);
  put_stars(s, galaxy, 1e8, 0.0);
  galaxy->born_here->radius = 0.5;
  ew_ledger_move_share(&galaxy->ledger, EW_DISC_GAS, EW_OUTSIDE, 1.0);
  galaxy->response_gas = 0.0;
  ew_ledger_move_share(&galaxy->ledger, EW_LIVING_STARS, EW_REMNANTS, 0.3);
  ew_step step = stage_step(s, galaxy);
  ew_respond_slowly(&step);
  assert_close(ew_half_mass_radius(galaxy), 0.5, SOLVED);
  ew_ledger_move_share(&galaxy->ledger, EW_LIVING_STARS, EW_LOST_GAS, 5.0 / 7.0);
  ew_respond_slowly(&step);
  assert_close(ew_half_mass_radius(galaxy), 1.0, SOLVED);
  ew_respond_slowly(&step);
  assert_close(ew_half_mass_radius(galaxy), 1.0, SOLVED);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(textbook_limits_without_dark_matter),
      cmocka_unit_test(unbound_stars_are_laid_down_far_out),
      cmocka_unit_test(cusps_hold_their_stars),
      cmocka_unit_test(dark_matter_weakens_the_response),
      cmocka_unit_test(invariants_hold_inside_a_halo),
      cmocka_unit_test(slow_changes_are_reversible),
      cmocka_unit_test(response_can_be_switched_off),
      cmocka_unit_test(small_changes_add_up),
      cmocka_unit_test(star_formation_moves_no_stars),
      cmocka_unit_test(stars_respond_to_their_own_loss),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
