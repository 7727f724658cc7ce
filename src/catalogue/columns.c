/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The columns of a catalogue, declared once: name, type, place in the row, unit, meaning. Writer, reader and
 * documentation follow these two tables. */
#include "elfinwood/catalogue.h"

#define REAL(name, field, unit, meaning)                                                                               \
  { name, EW_COLUMN_REAL, offsetof(ew_galaxy_row, field), unit, meaning }
#define INTEGER(name, field, meaning)                                                                                  \
  { name, EW_COLUMN_INTEGER, offsetof(ew_galaxy_row, field), "1", meaning }
#define KEY(name, field, meaning)                                                                                      \
  { name, EW_COLUMN_KEY, offsetof(ew_galaxy_row, field), "1", meaning }

#define ABUNDANCE(element) "mean of [" element "/Fe] over surviving stars, by number; metal-free stars left out"

const ew_column ew_galaxy_columns[] = {
    INTEGER("tree", tree, "number of the tree"),
    INTEGER("realization", realization, "number of the realization of the tree's galaxies"),
    KEY("branch", branch, "intrinsic name of the halo's branch within its tree"),
    INTEGER("halo_id", halo_id, "the user's own identifier of an imported tree; -1: none"),
    INTEGER("central", central, "1: central galaxy of the root; 0: bound member"),
    REAL("weight", weight, "1", "statistical weight of the tree"),
    REAL("halo_mass", halo_mass, "Msun", "virial mass of the halo (of a member: at infall)"),
    REAL("peak_halo_mass", peak_halo_mass, "Msun", "largest virial mass that the halo ever had"),
    REAL("stellar_mass", observed.stellar_mass, "Msun", "mass in living stars and remnants; 0 where no star is alive"),
    REAL("stellar_mass_formed", observed.stellar_mass_formed, "Msun", "mass ever formed into stars"),
    REAL("gas_mass", observed.gas_mass, "Msun", "gas in the galaxy"),
    REAL("luminosity_v", observed.luminosity_v, "Lsun,V", "V-band luminosity; 0: no stars"),
    REAL("magnitude_v", observed.magnitude_v, "mag", "absolute V magnitude (Vega)"),
    REAL("metallicity", observed.metallicity, "dex",
         "mean of [Fe/H] over surviving stars, by number; metal-free stars left out"),
    REAL("metallicity_spread", observed.metallicity_spread, "dex", "standard deviation of [Fe/H] over the same stars"),
    REAL("carbon", observed.abundance[EW_CARBON], "dex", ABUNDANCE("C")),
    REAL("nitrogen", observed.abundance[EW_NITROGEN], "dex", ABUNDANCE("N")),
    REAL("oxygen", observed.abundance[EW_OXYGEN], "dex", ABUNDANCE("O")),
    REAL("magnesium", observed.abundance[EW_MAGNESIUM], "dex", ABUNDANCE("Mg")),
    REAL("silicon", observed.abundance[EW_SILICON], "dex", ABUNDANCE("Si")),
    REAL("calcium", observed.abundance[EW_CALCIUM], "dex", ABUNDANCE("Ca")),
    REAL("half_light_radius", observed.half_light_radius, "pc", "radius of half the light in projection"),
    REAL("velocity_dispersion", observed.velocity_dispersion, "km/s", "of the stars along the line of sight, global"),
    REAL("time_50", observed.time_50, "Gyr", "time after the Big Bang by which half of the stars had formed"),
    REAL("time_90", observed.time_90, "Gyr", "time after the Big Bang by which 90 % of the stars had formed"),
    REAL("first_star_fraction", observed.first_star_fraction, "1",
         "share of metal-free stars in the stellar mass ever formed"),
    INTEGER("luminous_mergers", observed.luminous_mergers, "mergers above 1:20 in mass with a halo that had stars"),
    INTEGER("dark_mergers", observed.dark_mergers,
            "mergers above 1:20 in mass with a halo without stars, after the first star"),
    REAL("last_merger_redshift", observed.last_merger_redshift, "1", "redshift of the last of these mergers"),
    REAL("formation_redshift", formation_redshift, "1", "redshift at which the halo had half of its final mass"),
    REAL("reionization_redshift", reionization_redshift, "1", "redshift of local reionization"),
    REAL("streaming_velocity", streaming_velocity, "km/s", "of baryons against dark matter at redshift 1060"),
    INTEGER("quenched", observed.quenched, "1: no star formed in the last 0.5 Gyr; 0: some did; -1: never formed one"),
};

const size_t ew_galaxy_column_count = sizeof ew_galaxy_columns / sizeof ew_galaxy_columns[0];

#undef REAL
#undef INTEGER
#define REAL(field, unit, meaning)                                                                                     \
  { #field, EW_COLUMN_REAL, offsetof(ew_tree_row, field), unit, meaning }
#define INTEGER(field, meaning)                                                                                        \
  { #field, EW_COLUMN_INTEGER, offsetof(ew_tree_row, field), "1", meaning }

const ew_column ew_tree_columns[] = {
    INTEGER(tree, "number of the tree"),
    INTEGER(halo_id, "the user's own identifier of an imported tree; -1: none"),
    REAL(weight, "1", "statistical weight of the tree"),
    REAL(root_mass, "Msun", "virial mass of the root"),
    REAL(root_redshift, "1", "redshift of the root"),
    REAL(formation_redshift, "1", "redshift at which the main branch had half of the root's mass"),
    INTEGER(branches, "branches above the resolution"),
    INTEGER(nodes, "nodes of all branches"),
    REAL(smooth_fraction, "1", "share of the root's mass that came by smooth accretion"),
};

const size_t ew_tree_column_count = sizeof ew_tree_columns / sizeof ew_tree_columns[0];
