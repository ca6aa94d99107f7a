/* What every unit test needs: one suite a program, scratch files, and allocations that fail one after another. */
#ifndef SUPPORT_HARNESS_H
#define SUPPORT_HARNESS_H

#include "ballast/error.h"

#include <check.h>
#include <stdbool.h>
#include <stddef.h>

/** Runs a suite and gives the program's exit status. */
int run_suite(Suite *suite);

/** A path of a test's own file under tests/, such as "data/titanic.csv"; borrowed until the next call. */
const char *test_path(const char *relative);

/** A scratch folder of this process, removed when it ends. */
const char *scratch_dir(void);
/** Writes bytes into a file of the scratch folder; its path is borrowed until the next call with that name. */
const char *scratch_file(const char *name, const void *bytes, size_t length);

/**
 * Runs an action with its 1st, 2nd, 3rd ... allocation failing until it succeeds, and fails the test unless every failed
 * run reports BAL_ERR_MEMORY. The action frees whatever it made and checks that a failed call left its output NULL.
 * Returns how many runs failed.
 */
size_t survive_allocations(bal_status (*action)(void *context, bal_error *err), void *context);

/** |a - b| <= tolerance x max(1, |b|). */
bool near(double a, double b, double tolerance);

#endif
