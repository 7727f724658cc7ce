/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Integral and inverse of x^-slope, the law behind initial mass functions and delay times. */
#ifndef EW_STARS_POWER_LAW_H
#define EW_STARS_POWER_LAW_H

/* Integral of x^-slope from `from` to `to`, 0 < from <= to; any slope, 1 included. */
double ew_power_integral(double slope, double from, double to);

/* Where the integral from `low` reaches the fraction u of that from `low` to `high`. */
double ew_power_draw(double slope, double low, double high, double u);

#endif
