/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The whole library in one include. */
#ifndef ELFINWOOD_ELFINWOOD_H
#define ELFINWOOD_ELFINWOOD_H

#include "elfinwood/catalogue.h"
#include "elfinwood/core.h"
#include "elfinwood/cosmology.h"
#include "elfinwood/galaxy.h"
#include "elfinwood/halo.h"
#include "elfinwood/population.h"
#include "elfinwood/stars.h"
#include "elfinwood/tree.h"

#endif
