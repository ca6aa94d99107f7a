#include "model/graph.h"

#include "base/memory.h"

#include <stdint.h>
#include <string.h>

/* The children of every variable, as one array cut by start. */
typedef struct children {
    size_t *start; /* n + 1 */
    size_t *list;  /* arcs */
} children;

static bal_status list_children(const bal_family_spec *families, size_t n, children *c, bal_error *err) {
    size_t arcs = 0;
    for (size_t v = 0; v < n; v++) arcs += families[v].n_parents;
    c->start = bali_allocate(n + 2, sizeof *c->start);
    c->list = bali_allocate(arcs, sizeof *c->list);
    if (!c->start || !c->list) return bali_out_of_memory(err);
    for (size_t v = 0; v < n; v++)
        for (size_t p = 0; p < families[v].n_parents; p++) c->start[families[v].parents[p] + 2]++;
    for (size_t v = 1; v <= n; v++) c->start[v + 1] += c->start[v];
    for (size_t v = 0; v < n; v++)
        for (size_t p = 0; p < families[v].n_parents; p++) c->list[c->start[families[v].parents[p] + 1]++] = v;
    return BAL_OK;
}

/* Every variable that is not placed has a parent that is not placed: walking to such parents ends in a cycle. */
static void find_cycle(const bal_family_spec *families, size_t n, const bool *placed, size_t *walk, size_t *seen_at,
                       size_t *n_cycle) {
    size_t v = 0, length = 0;
    while (placed[v]) v++;
    memset(seen_at, 0, n * sizeof *seen_at);
    while (seen_at[v] == 0) {
        walk[length++] = v;
        seen_at[v] = length;
        size_t p = 0;
        while (placed[families[v].parents[p]]) p++;
        v = families[v].parents[p];
    }
    size_t from = seen_at[v] - 1;
    *n_cycle = length - from;
    memmove(walk, walk + from, *n_cycle * sizeof *walk);
    for (size_t i = 0; i < *n_cycle / 2; i++) { /* child to parent so far: turn it round */
        size_t other = walk[*n_cycle - 1 - i];
        walk[*n_cycle - 1 - i] = walk[i];
        walk[i] = other;
    }
}

/* A heap of ready variables, the smallest on top. */
static void push(size_t *heap, size_t *size, size_t v) {
    size_t at = (*size)++;
    while (at > 0 && heap[(at - 1) / 2] > v) {
        heap[at] = heap[(at - 1) / 2];
        at = (at - 1) / 2;
    }
    heap[at] = v;
}

static size_t pop(size_t *heap, size_t *size) {
    size_t top = heap[0], last = heap[--*size], at = 0;
    for (size_t child; (child = 2 * at + 1) < *size; at = child) {
        if (child + 1 < *size && heap[child + 1] < heap[child]) child++;
        if (heap[child] >= last) break;
        heap[at] = heap[child];
    }
    heap[at] = last;
    return top;
}

bal_status bali_graph_order(const bal_family_spec *families, size_t n, size_t *order, size_t *cycle, size_t *n_cycle,
                            bal_error *err) {
    *n_cycle = 0;
    bal_status status = BAL_OK;
    children c = {0};
    size_t *waiting = bali_allocate(n, sizeof *waiting); /* parents that are not placed yet */
    size_t *heap = bali_allocate(n, sizeof *heap);
    bool *placed = bali_allocate(n, sizeof *placed);
    if (!waiting || !heap || !placed) status = bali_out_of_memory(err);
    if (status == BAL_OK) status = list_children(families, n, &c, err);
    if (status != BAL_OK) goto done;

    size_t ready = 0, n_placed = 0;
    for (size_t v = 0; v < n; v++) {
        waiting[v] = families[v].n_parents;
        if (waiting[v] == 0) push(heap, &ready, v);
    }
    while (ready > 0) {
        size_t v = pop(heap, &ready);
        order[n_placed++] = v;
        placed[v] = true;
        for (size_t i = c.start[v]; i < c.start[v + 1]; i++)
            if (--waiting[c.list[i]] == 0) push(heap, &ready, c.list[i]);
    }
    if (n_placed < n) find_cycle(families, n, placed, cycle, waiting, n_cycle);

done:
    bali_free(c.start);
    bali_free(c.list);
    bali_free(waiting);
    bali_free(heap);
    bali_free(placed);
    return status;
}
