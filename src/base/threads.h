/* Independent tasks over several threads. */
#ifndef BASE_THREADS_H
#define BASE_THREADS_H

#include "ballast/error.h"

/** One task; task runs from 0 to n_tasks - 1. Tasks share nothing that they write. */
typedef bal_status (*bali_task)(void *context, size_t task, bal_error *err);

/**
 * Runs n_tasks tasks on at most n_threads threads, the caller's own among them. When a thread cannot be started the others do
 * its work; *started says how many there were (may be NULL).
 *
 * When a task fails, no task of a higher number is begun, and all of a lower one are run: so the error reported, that of the
 * failed task with the lowest number, does not depend on the number of threads. The threads started here leave
 * interrupts to the caller's.
 */
BAL_MUST_CHECK bal_status bali_run_tasks(bali_task task, void *context, size_t n_tasks, unsigned n_threads, unsigned *started,
                                         bal_error *err);

/** Processors of this machine that are at work; at least 1. */
unsigned bali_processors(void);

#endif
