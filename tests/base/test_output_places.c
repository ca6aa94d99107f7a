/* Outputs that are no ordinary files, and what happens to ordinary ones when two write, or a program is killed. */
#include "base/output.h"
#include "base/scratch.h"
#include "support/harness.h"

#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <pthread.h>
#include <signal.h>
#include <stdio.h>
#include <string.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

START_TEST(devices_are_written_in_place) {
    bal_error err = {0};
    ck_assert_int_eq(bali_output_write_whole("/dev/null", "x", 1, &err), BAL_OK);
    struct stat now;
    ck_assert(stat("/dev/null", &now) == 0 && S_ISCHR(now.st_mode));
    ck_assert_int_eq(bali_output_write_whole("/dev/full", "x", 1, &err), BAL_ERR_IO);
    ck_assert_str_eq(err.code, "cannot-write");
    ck_assert_str_eq(err.file, "/dev/full");
    ck_assert(strstr(err.message, strerror(ENOSPC)));
}
END_TEST

START_TEST(a_failure_of_writing_is_remembered) {
    static char bytes[70000];
    bali_output *output = NULL;
    ck_assert_int_eq(bali_output_open("/dev/full", &output, NULL), BAL_OK);
    ck_assert_int_eq(bali_output_write(output, bytes, sizeof bytes, NULL), BAL_ERR_IO);
    ck_assert_int_eq(bali_output_write(output, bytes, 1, NULL), BAL_ERR_IO);
    ck_assert_int_eq(bali_output_commit(output, NULL), BAL_ERR_IO);
}
END_TEST

typedef struct fifo_reader {
    const char *name;
    char bytes[64];
    bool leaves; /* without reading */
} fifo_reader;

static void *read_fifo(void *context) {
    fifo_reader *reader = context;
    int descriptor = open(reader->name, O_RDONLY);
    size_t length = 0;
    for (ssize_t got; !reader->leaves && (got = read(descriptor, reader->bytes + length, sizeof reader->bytes - 1 - length)) > 0;)
        length += (size_t)got;
    (void)close(descriptor);
    return NULL;
}

START_TEST(a_fifo_is_written_in_place) {
    ck_assert_int_eq(mkfifo(in_scratch("fifo"), 0600), 0);
    fifo_reader reader = {.name = scratch_name};
    pthread_t thread;
    ck_assert_int_eq(pthread_create(&thread, NULL, read_fifo, &reader), 0);
    ck_assert_int_eq(bali_output_write_whole(scratch_name, "through", 7, NULL), BAL_OK);
    (void)pthread_join(thread, NULL);
    ck_assert_str_eq(reader.bytes, "through");
    struct stat now;
    ck_assert(lstat(scratch_name, &now) == 0 && S_ISFIFO(now.st_mode));
}
END_TEST

START_TEST(a_reader_that_leaves_is_told_of) {
    static char bytes[1 << 17];
    (void)signal(SIGPIPE, SIG_IGN);
    ck_assert_int_eq(mkfifo(in_scratch("left"), 0600), 0);
    fifo_reader reader = {.name = scratch_name, .leaves = true};
    pthread_t thread;
    ck_assert_int_eq(pthread_create(&thread, NULL, read_fifo, &reader), 0);
    bal_error err = {0};
    ck_assert_int_eq(bali_output_write_whole(scratch_name, bytes, sizeof bytes, &err), BAL_ERR_IO);
    (void)pthread_join(thread, NULL);
    ck_assert_str_eq(err.code, "cannot-write");
    ck_assert_msg(strstr(err.message, strerror(EPIPE)) != NULL, "%s", err.message);
}
END_TEST

/* Puts a descriptor in standard output's place; gives what stood there. */
static int swap_standard_output(int descriptor) {
    (void)fflush(stdout);
    int kept = dup(STDOUT_FILENO);
    if (descriptor >= 0) (void)dup2(descriptor, STDOUT_FILENO);
    else (void)close(STDOUT_FILENO);
    return kept;
}

static void restore_standard_output(int kept) {
    (void)dup2(kept, STDOUT_FILENO);
    (void)close(kept);
}

START_TEST(standard_output_is_written_and_stays_open) {
    static const char *const names[] = {"-", "/dev/stdout", "/dev/fd/1", "/proc/self/fd/1"};
    const char *file = old_file("stdout");
    int descriptor = open(file, O_WRONLY | O_APPEND);
    int kept = swap_standard_output(descriptor);
    bal_status status = bali_output_write_whole(names[_i], " and new", 8, NULL);
    bool open_still = fcntl(STDOUT_FILENO, F_GETFD) >= 0;
    restore_standard_output(kept);
    (void)close(descriptor);
    ck_assert_int_eq(status, BAL_OK);
    ck_assert(open_still);
    ck_assert_str_eq(content(file), "old and new");
}
END_TEST

START_TEST(standard_output_that_is_full_or_closed_is_told_of) {
    bal_error full = {0}, closed = {0};
    int descriptor = open("/dev/full", O_WRONLY);
    int kept = swap_standard_output(descriptor);
    bal_status of_full = bali_output_write_whole("-", "x", 1, &full);
    (void)close(STDOUT_FILENO);
    bal_status of_closed = bali_output_write_whole("-", "x", 1, &closed);
    restore_standard_output(kept);
    (void)close(descriptor);
    ck_assert_int_eq(of_full, BAL_ERR_IO);
    ck_assert_int_eq(of_closed, BAL_ERR_IO);
    ck_assert_str_eq(full.file, "standard output");
    ck_assert_msg(strstr(full.message, strerror(ENOSPC)) && strstr(closed.message, strerror(EBADF)), "%s %s", full.message, closed.message);
}
END_TEST

static void *drain_slowly(void *context) {
    int descriptor = *(int *)context;
    static char bytes[4096];
    size_t total = 0;
    for (ssize_t got; (got = read(descriptor, bytes, sizeof bytes)) > 0;) {
        total += (size_t)got;
        (void)poll(NULL, 0, 1);
    }
    return (void *)total;
}

START_TEST(standard_output_may_be_non_blocking) {
    static char bytes[300000];
    int ends[2];
    ck_assert_int_eq(pipe(ends), 0);
    ck_assert_int_eq(fcntl(ends[1], F_SETFL, O_NONBLOCK), 0);
    pthread_t thread;
    ck_assert_int_eq(pthread_create(&thread, NULL, drain_slowly, &ends[0]), 0);
    int kept = swap_standard_output(ends[1]);
    bal_status status = bali_output_write_whole("-", bytes, sizeof bytes, NULL);
    restore_standard_output(kept);
    (void)close(ends[1]);
    void *total = NULL;
    (void)pthread_join(thread, &total);
    ck_assert_int_eq(status, BAL_OK);
    ck_assert_uint_eq((size_t)total, sizeof bytes);
}
END_TEST

START_TEST(a_file_size_limit_leaves_the_old_file) {
    static char bytes[100000];
    const char *name = old_file("limited");
    int before = entries();
    (void)signal(SIGXFSZ, SIG_IGN);
    struct rlimit limit;
    ck_assert_int_eq(getrlimit(RLIMIT_FSIZE, &limit), 0);
    const rlim_t usual = limit.rlim_cur;
    limit.rlim_cur = 1024;
    ck_assert_int_eq(setrlimit(RLIMIT_FSIZE, &limit), 0);
    bal_error err = {0};
    bal_status status = bali_output_write_whole(name, bytes, sizeof bytes, &err);
    limit.rlim_cur = usual;
    ck_assert_int_eq(setrlimit(RLIMIT_FSIZE, &limit), 0);
    ck_assert_int_eq(status, BAL_ERR_IO);
    ck_assert_msg(strstr(err.message, strerror(EFBIG)) != NULL, "%s", err.message);
    ck_assert_str_eq(content(name), "old");
    ck_assert_int_eq(entries(), before);
}
END_TEST

/* Two writers of one path: whoever commits last has it, whole. */
START_TEST(two_writers_leave_one_complete_file) {
    const char *name = in_scratch("contended");
    bali_output *first = NULL, *second = NULL;
    if (_i) (void)old_file("contended");
    ck_assert_int_eq(bali_output_open(name, &first, NULL), BAL_OK);
    ck_assert_int_eq(bali_output_open(name, &second, NULL), BAL_OK);
    ck_assert_int_eq(bali_output_write(first, "first", 5, NULL), BAL_OK);
    ck_assert_int_eq(bali_output_write(second, "second", 6, NULL), BAL_OK);
    ck_assert_int_eq(bali_output_commit(second, NULL), BAL_OK);
    ck_assert_str_eq(content(name), "second");
    int before = entries();
    ck_assert_int_eq(bali_output_commit(first, NULL), BAL_OK); /* the name is taken by now */
    ck_assert_str_eq(content(name), "first");
    ck_assert_int_eq(entries(), before);
}
END_TEST

START_TEST(two_processes_leave_one_complete_file) {
    enum { TIMES = 40, SIZE = 5000 };
    static char bytes[SIZE];
    int before = entries();
    const char *name = in_scratch("fought over");
    pid_t children[2];
    for (int c = 0; c < 2; c++) {
        children[c] = fork();
        if (children[c] != 0) continue;
        memset(bytes, 'a' + c, sizeof bytes);
        for (int i = 0; i < TIMES; i++)
            if (bali_output_write_whole(name, bytes, sizeof bytes, NULL) != BAL_OK ||
                (i % 8 == 0 && unlink(name) != 0 && errno != ENOENT))
                _exit(1);
        _exit(0);
    }
    for (int c = 0; c < 2; c++) {
        int status = -1;
        ck_assert_int_eq(waitpid(children[c], &status, 0), children[c]);
        ck_assert_int_eq(status, 0);
    }
    const char *left = content(name);
    ck_assert(strlen(left) == SIZE && (strspn(left, "a") == SIZE || strspn(left, "b") == SIZE));
    ck_assert_int_eq(unlink(name), 0);
    ck_assert_int_eq(entries(), before);
}
END_TEST

/* Killed while it writes, an unnamed file leaves nothing. */
START_TEST(a_kill_leaves_the_old_file) {
    const char *name = old_file("killed");
    int before = entries();
    pid_t child = fork();
    if (child == 0) {
        static char bytes[100000];
        bali_output *output = NULL;
        if (bali_output_open(name, &output, NULL) != BAL_OK || bali_output_write(output, bytes, sizeof bytes, NULL) != BAL_OK) _exit(1);
        (void)raise(SIGKILL);
    }
    int status = 0;
    ck_assert_int_eq(waitpid(child, &status, 0), child);
    ck_assert(WIFSIGNALED(status) && WTERMSIG(status) == SIGKILL);
    ck_assert_str_eq(content(name), "old");
    ck_assert_int_eq(entries(), before);
}
END_TEST

START_TEST(signals_are_held_only_for_a_moment) {
    sigset_t before, after;
    ck_assert_int_eq(pthread_sigmask(SIG_SETMASK, NULL, &before), 0);
    ck_assert_int_eq(bali_output_write_whole(old_file("masked"), "new", 3, NULL), BAL_OK);
    ck_assert_int_eq(pthread_sigmask(SIG_SETMASK, NULL, &after), 0);
    for (int number = 1; number < 32; number++) ck_assert_int_eq(sigismember(&before, number), sigismember(&after, number));
    errno = 77;
    bali_output_interrupted(); /* with nothing to remove */
    ck_assert_int_eq(errno, 77);
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("output_places");
    TCase *tests = tcase_create("output_places");
    tcase_set_timeout(tests, 60);
    tcase_add_test(tests, devices_are_written_in_place);
    tcase_add_test(tests, a_failure_of_writing_is_remembered);
    tcase_add_test(tests, a_fifo_is_written_in_place);
    tcase_add_test(tests, a_reader_that_leaves_is_told_of);
    tcase_add_loop_test(tests, standard_output_is_written_and_stays_open, 0, 4);
    tcase_add_test(tests, standard_output_that_is_full_or_closed_is_told_of);
    tcase_add_test(tests, standard_output_may_be_non_blocking);
    tcase_add_test(tests, a_file_size_limit_leaves_the_old_file);
    tcase_add_loop_test(tests, two_writers_leave_one_complete_file, 0, 2);
    tcase_add_test(tests, two_processes_leave_one_complete_file);
    tcase_add_test(tests, a_kill_leaves_the_old_file);
    tcase_add_test(tests, signals_are_held_only_for_a_moment);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
