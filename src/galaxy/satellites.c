/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Satellites: how long a halo that has fallen in takes to sink to the centre. */
#include "galaxy/state.h"

#define ROW(field) offsetof(ew_satellite_parameters, field)

const ew_parameter ew_satellite_rows[] = {
    {.name = "satellites.friction_factor",
     .type = EW_REAL,
     .offset = ROW(friction_factor),
     .unit = "1",
     .standard = "1",
     .low = 0,
     .high = 10,
     .meaning = "factor on the time that dynamical friction takes; 0: mergers at infall",
     .source = "Boylan-Kolchin, Ma & Quataert 2008, MNRAS 383, 93"},
    {.name = NULL},
};

const ew_process_record ew_satellite_process = {
    .name = "satellites",
    .meaning = "dynamical friction on haloes that fell in",
    .source = "Boylan-Kolchin, Ma & Quataert 2008, MNRAS 383, 93, eq. 5; orbits of Zentner et al. 2005, ApJ 624, 505",
    .rows = ew_satellite_rows,
};

double ew_sinking_time(const ew_environment *host, double satellite_mass, uint64_t satellite_branch, uint64_t ordinal) {
  ew_stream stream = ew_stream_open(host->draws, EW_PROCESS_ORBITS, satellite_branch, ordinal);
  double u_circularity = ew_draw_uniform(&stream), u_radius = ew_draw_uniform(&stream);
  ew_orbit orbit = ew_orbit_draw(u_circularity, u_radius);
  double ratio = host->halo.mass > satellite_mass ? host->halo.mass / satellite_mass : 1.0;
  double crossing = ew_halo_crossing_time(host->world->cosmology, host->redshift);
  return host->model->satellites.friction_factor * ew_friction_time(ratio, &orbit, crossing);
}
