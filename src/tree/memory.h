/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Growing arrays for one tree, filled latest node first; internal to the tree room. Functions that return bool return
 * false when memory is short. */
#ifndef EW_TREE_MEMORY_H
#define EW_TREE_MEMORY_H

#include "elfinwood/tree.h"

/* A branch still to be walked: its state where it joins, and what it joins (counted latest first). */
typedef struct {
  double mass, clock, redshift;
  uint64_t key;
  int64_t joins_branch; /* -1: the main branch */
  size_t joins_node;
} ew_walk;

bool ew_tree_memory_start(ew_tree_memory *memory, double mass, double clock, double redshift);
bool ew_tree_memory_pop(ew_tree_memory *memory, ew_walk *walk);               /* false: nothing left */
bool ew_tree_memory_open_branch(ew_tree_memory *memory, const ew_walk *walk); /* with its latest node */
bool ew_tree_memory_add_node(ew_tree_memory *memory, double mass, double redshift);

/* The part that joined the open branch at the node just laid, by that ordinal of its splits. */
bool ew_tree_memory_push(ew_tree_memory *memory, double mass, double clock, double redshift, uint64_t ordinal);

/* Reverses everything into the order of ew_tree. */
void ew_tree_memory_finish(ew_tree_memory *memory, const ew_root *root, ew_tree *tree);

#endif
