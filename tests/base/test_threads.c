#include "base/threads.h"
#include "base/memory.h"
#include "support/harness.h"

#include <pthread.h>
#include <signal.h>
#include <stdio.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

enum { MOST = 1000 };

/* What the tasks of a test do and leave behind; each task writes only its own elements. */
typedef struct log_book {
    unsigned runs[MOST];
    bool fails[MOST];
    unsigned slow; /* tasks below this take a few milliseconds */
} log_book;

static void pause_milliseconds(long milliseconds) {
    struct timespec time = {.tv_nsec = milliseconds * 1000000};
    (void)nanosleep(&time, NULL);
}

static bal_status record(void *context, size_t task, bal_error *err) {
    log_book *book = context;
    book->runs[task]++;
    if (task < book->slow) pause_milliseconds(3);
    return book->fails[task] ? bal_error_set(err, BAL_ERR_DATA, "task", "task %zu failed", task) : BAL_OK;
}

static const struct {
    size_t n_tasks;
    unsigned n_threads, most_started;
} sizes[] = {{0, 4, 1}, {1, 4, 1}, {2, 8, 2}, {MOST, 0, 1}, {MOST, 1, 1}, {MOST, 2, 2}, {MOST, 16, 16}, {5, 1000000, 5}};

START_TEST(every_task_runs_once) {
    static log_book book;
    memset(&book, 0, sizeof book);
    unsigned started = 0;
    bal_error err = {0};
    ck_assert_int_eq(bali_run_tasks(record, &book, sizes[_i].n_tasks, sizes[_i].n_threads, &started, &err), BAL_OK);
    for (size_t t = 0; t < MOST; t++) ck_assert_uint_eq(book.runs[t], t < sizes[_i].n_tasks);
    ck_assert_uint_eq(started, sizes[_i].most_started);
    ck_assert_int_eq(err.status, BAL_OK);
    ck_assert_int_eq(bali_run_tasks(record, &book, sizes[_i].n_tasks, sizes[_i].n_threads, NULL, NULL), BAL_OK);
}
END_TEST

/* A lower task that is slow to fail still is the one reported, whatever the number of threads. */
START_TEST(the_lowest_failure_is_reported) {
    static const unsigned threads[] = {1, 2, 3, 8, 64};
    static log_book book;
    for (unsigned repeat = 0; repeat < 5; repeat++) {
        memset(&book, 0, sizeof book);
        book.slow = MOST;
        book.fails[17] = book.fails[18] = book.fails[25] = book.fails[900] = true;
        bal_error err = {0};
        ck_assert_int_eq(bali_run_tasks(record, &book, MOST, threads[_i], NULL, &err), BAL_ERR_DATA);
        ck_assert_str_eq(err.message, "task 17 failed");
        for (size_t t = 0; t <= 17; t++) ck_assert_uint_eq(book.runs[t], 1);
        if (threads[_i] <= 8) ck_assert_uint_eq(book.runs[900], 0); /* it would be a third of a second until then */
    }
}
END_TEST

START_TEST(an_earlier_failure_is_kept) {
    static log_book book;
    memset(&book, 0, sizeof book);
    book.fails[0] = true;
    bal_error err = {0};
    (void)bal_error_set(&err, BAL_ERR_IO, "first", "first");
    ck_assert_int_ne(bali_run_tasks(record, &book, 3, 2, NULL, &err), BAL_OK);
    ck_assert_str_eq(err.message, "first");
    ck_assert_int_eq(bali_run_tasks(record, &book, 3, 2, NULL, NULL), BAL_ERR_DATA);
}
END_TEST

static bal_status run_some(void *context, bal_error *err) {
    return bali_run_tasks(record, context, 100, 4, NULL, err);
}

START_TEST(no_memory_is_told) {
    static log_book book;
    ck_assert_uint_eq(survive_allocations(run_some, &book), 1);
}
END_TEST

static bal_status check_mask(void *context, size_t task, bal_error *err) {
    pthread_t caller = *(pthread_t *)context;
    (void)task;
    pause_milliseconds(1);
    sigset_t mask;
    (void)pthread_sigmask(SIG_SETMASK, NULL, &mask);
    bool held = sigismember(&mask, SIGINT) && sigismember(&mask, SIGTERM) && sigismember(&mask, SIGHUP);
    if (held != !pthread_equal(caller, pthread_self())) return bal_error_set(err, BAL_ERR_DATA, "mask", "task %zu: wrong mask", task);
    return BAL_OK;
}

START_TEST(interrupts_are_left_to_the_caller) {
    pthread_t self = pthread_self();
    bal_error err = {0};
    ck_assert_msg(bali_run_tasks(check_mask, &self, 40, 4, NULL, &err) == BAL_OK, "%s", err.message);
}
END_TEST

START_TEST(there_is_a_processor) {
    ck_assert_uint_ge(bali_processors(), 1);
    ck_assert_int_eq(bali_processors(), sysconf(_SC_NPROCESSORS_ONLN));
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("threads");
    TCase *tests = tcase_create("threads");
    tcase_set_timeout(tests, 30);
    tcase_add_loop_test(tests, every_task_runs_once, 0, (int)(sizeof sizes / sizeof sizes[0]));
    tcase_add_loop_test(tests, the_lowest_failure_is_reported, 0, 5);
    tcase_add_test(tests, an_earlier_failure_is_kept);
    tcase_add_test(tests, no_memory_is_told);
    tcase_add_test(tests, interrupts_are_left_to_the_caller);
    tcase_add_test(tests, there_is_a_processor);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
