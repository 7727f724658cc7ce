/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * An arena is a chain of blocks, newest first. Returning to a mark frees the blocks that came after it, except one that
 * is kept in reserve, so that a loop which takes and returns the same amount causes no heap traffic. */
#include "elfinwood/core.h"

#include <stdlib.h>
#include <string.h>

enum { FIRST_BLOCK_SIZE = 1 << 16 };

typedef struct block {
  struct block *older;
  size_t size, used;
  max_align_t data[];
} block;

struct ew_arena {
  block *newest;
  block *reserve;
};

ew_arena *ew_arena_new(void) {
  return calloc(1, sizeof(ew_arena));
}

void ew_arena_free(ew_arena *arena) {
  if (!arena)
    return;
  ew_arena_return(arena, (ew_arena_mark){0});
  free(arena->reserve);
  free(arena);
}

static block *block_with_room(ew_arena *arena, size_t size) {
  block *fresh = arena->reserve;
  if (fresh && fresh->size >= size) {
    arena->reserve = NULL;
  } else {
    size_t wanted = arena->newest ? 2 * arena->newest->size : FIRST_BLOCK_SIZE;
    if (wanted < size)
      wanted = size;
    fresh = malloc(sizeof(block) + wanted);
    if (!fresh)
      return NULL;
    fresh->size = wanted;
  }
  fresh->used = 0;
  fresh->older = arena->newest;
  arena->newest = fresh;
  return fresh;
}

void *ew_arena_take(ew_arena *arena, size_t size) {
  const size_t align = sizeof(max_align_t);
  if (size > SIZE_MAX / 4)
    return NULL;
  size = (size + align - 1) / align * align;
  block *from = arena->newest;
  if (!from || from->size - from->used < size)
    from = block_with_room(arena, size);
  if (!from)
    return NULL;
  void *piece = (char *)from->data + from->used;
  from->used += size;
  return memset(piece, 0, size);
}

ew_arena_mark ew_arena_tell(const ew_arena *arena) {
  return (ew_arena_mark){arena->newest, arena->newest ? arena->newest->used : 0};
}

/* The larger of the two blocks stays in reserve. */
static void retire(ew_arena *arena, block *old) {
  if (arena->reserve && arena->reserve->size >= old->size) {
    free(old);
    return;
  }
  free(arena->reserve);
  arena->reserve = old;
}

void ew_arena_return(ew_arena *arena, ew_arena_mark mark) {
  while (arena->newest && arena->newest != mark.block) {
    block *old = arena->newest;
    arena->newest = old->older;
    retire(arena, old);
  }
  if (arena->newest)
    arena->newest->used = mark.used;
}
