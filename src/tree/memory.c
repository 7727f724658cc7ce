/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Growing arrays for one tree. They keep their size from tree to tree, so a loop over trees soon stops allocating. */
#include "tree/memory.h"

#include <stdlib.h>

struct ew_tree_memory {
  ew_branch *branch; /* while growing, indices count latest first */
  double *mass, *redshift;
  ew_walk *stack;
  size_t branch_count, branch_capacity;
  size_t node_count, node_capacity;
  size_t stack_count, stack_capacity;
};

ew_tree_memory *ew_tree_memory_new(void) {
  return calloc(1, sizeof(ew_tree_memory));
}

void ew_tree_memory_free(ew_tree_memory *memory) {
  if (!memory)
    return;
  free(memory->branch);
  free(memory->mass);
  free(memory->redshift);
  free(memory->stack);
  free(memory);
}

/* The array, or a larger one in its place, with room for `wanted` elements; NULL when memory is short. */
static void *grown(void *array, size_t *capacity, size_t wanted, size_t element) {
  if (wanted <= *capacity)
    return array;
  size_t larger = *capacity ? *capacity : 256;
  while (larger < wanted)
    larger *= 2;
  void *moved = realloc(array, larger * element);
  if (moved)
    *capacity = larger;
  return moved;
}

static bool reserve_node(ew_tree_memory *memory) {
  if (memory->node_count >= UINT32_MAX)
    return false;
  size_t capacity = memory->node_capacity, wanted = memory->node_count + 1;
  double *mass = grown(memory->mass, &capacity, wanted, sizeof *mass);
  if (!mass)
    return false;
  memory->mass = mass;
  double *redshift = grown(memory->redshift, &memory->node_capacity, wanted, sizeof *redshift);
  if (!redshift)
    return false;
  memory->redshift = redshift;
  return true;
}

bool ew_tree_memory_add_node(ew_tree_memory *memory, double mass, double redshift) {
  if (!reserve_node(memory))
    return false;
  memory->mass[memory->node_count] = mass;
  memory->redshift[memory->node_count] = redshift;
  memory->node_count++;
  memory->branch[memory->branch_count - 1].node_count++;
  return true;
}

static bool push(ew_tree_memory *memory, ew_walk walk) {
  ew_walk *stack = grown(memory->stack, &memory->stack_capacity, memory->stack_count + 1, sizeof *stack);
  if (!stack)
    return false;
  memory->stack = stack;
  stack[memory->stack_count++] = walk;
  return true;
}

bool ew_tree_memory_start(ew_tree_memory *memory, double mass, double clock, double redshift) {
  memory->branch_count = memory->node_count = memory->stack_count = 0;
  return push(memory, (ew_walk){mass, clock, redshift, ew_branch_key_root(), -1, 0});
}

bool ew_tree_memory_push(ew_tree_memory *memory, double mass, double clock, double redshift, uint64_t ordinal) {
  uint64_t key = ew_branch_key_child(memory->branch[memory->branch_count - 1].key, ordinal);
  return push(memory, (ew_walk){mass, clock, redshift, key, (int64_t)memory->branch_count - 1, memory->node_count - 1});
}

bool ew_tree_memory_pop(ew_tree_memory *memory, ew_walk *walk) {
  if (memory->stack_count == 0)
    return false;
  *walk = memory->stack[--memory->stack_count];
  return true;
}

bool ew_tree_memory_open_branch(ew_tree_memory *memory, const ew_walk *walk) {
  if (memory->branch_count >= INT32_MAX)
    return false;
  ew_branch *branch = grown(memory->branch, &memory->branch_capacity, memory->branch_count + 1, sizeof *branch);
  if (!branch)
    return false;
  memory->branch = branch;
  branch[memory->branch_count++] = (ew_branch){.key = walk->key,
                                               .first_node = (uint32_t)memory->node_count,
                                               .joins_branch = (int32_t)walk->joins_branch,
                                               .joins_node = (uint32_t)walk->joins_node};
  return ew_tree_memory_add_node(memory, walk->mass, walk->redshift);
}

static void reverse(double *value, size_t count) {
  for (size_t low = 0, high = count; low + 1 < high; low++) {
    high--;
    double kept = value[low];
    value[low] = value[high];
    value[high] = kept;
  }
}

static ew_branch counted_earliest_first(const ew_tree_memory *memory, ew_branch branch) {
  branch.first_node = (uint32_t)memory->node_count - branch.first_node - branch.node_count;
  if (branch.joins_branch >= 0) {
    branch.joins_branch = (int32_t)memory->branch_count - 1 - branch.joins_branch;
    branch.joins_node = (uint32_t)memory->node_count - 1 - branch.joins_node;
  }
  return branch;
}

void ew_tree_memory_finish(ew_tree_memory *memory, const ew_root *root, ew_tree *tree) {
  reverse(memory->mass, memory->node_count);
  reverse(memory->redshift, memory->node_count);
  for (size_t low = 0, high = memory->branch_count - 1; low <= high && high < memory->branch_count; low++, high--) {
    ew_branch first = counted_earliest_first(memory, memory->branch[low]);
    memory->branch[low] = counted_earliest_first(memory, memory->branch[high]);
    memory->branch[high] = first;
  }
  *tree = (ew_tree){.number = root->number,
                    .halo_id = root->halo_id,
                    .weight = root->weight,
                    .branch_count = memory->branch_count,
                    .node_count = memory->node_count,
                    .branch = memory->branch,
                    .mass = memory->mass,
                    .redshift = memory->redshift};
}
