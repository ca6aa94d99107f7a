#define _XOPEN_SOURCE 700 /* posix_openpt and what goes with it */
#include "base/progress.h"
#include "support/harness.h"

#include <fcntl.h>
#include <poll.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

/* A terminal whose screen is read by the test; standard error is put on it. */
struct screen {
    int master, kept;
};

static struct screen on_terminal(const char *kind) {
    struct screen screen = {.master = posix_openpt(O_RDWR | O_NOCTTY)};
    ck_assert_int_ge(screen.master, 0);
    ck_assert(grantpt(screen.master) == 0 && unlockpt(screen.master) == 0);
    int terminal = open(ptsname(screen.master), O_RDWR | O_NOCTTY);
    ck_assert_int_ge(terminal, 0);
    screen.kept = dup(STDERR_FILENO);
    (void)dup2(terminal, STDERR_FILENO);
    (void)close(terminal);
    ck_assert_int_eq(kind ? setenv("TERM", kind, 1) : unsetenv("TERM"), 0);
    return screen;
}

/* What came to the screen so far. */
static const char *seen(const struct screen *screen) {
    static char text[4096];
    size_t length = 0;
    struct pollfd wait = {.fd = screen->master, .events = POLLIN};
    while (length < sizeof text - 1 && poll(&wait, 1, 50) > 0) {
        ssize_t got = read(screen->master, text + length, sizeof text - 1 - length);
        if (got <= 0) break;
        length += (size_t)got;
    }
    text[length] = '\0';
    return text;
}

static void leave_terminal(struct screen *screen) {
    (void)dup2(screen->kept, STDERR_FILENO);
    (void)close(screen->kept);
    (void)close(screen->master);
}

START_TEST(a_terminal_sees_progress_and_then_a_clean_line) {
    struct screen screen = on_terminal("xterm");
    bali_progress progress;
    char first[200], second[200], third[200], wiped[200];
    bali_progress_start(&progress, "reading", false);
    bali_progress_step(&progress, 1, 10);
    (void)snprintf(first, sizeof first, "%s", seen(&screen));
    progress.started -= 2; /* as if two seconds had gone by */
    bali_progress_step(&progress, 5, 10);
    bali_progress_step(&progress, 6, 10); /* too soon after the last one */
    (void)snprintf(second, sizeof second, "%s", seen(&screen));
    progress.last -= 1;
    bali_progress_step(&progress, 1234567, 0);
    (void)snprintf(third, sizeof third, "%s", seen(&screen));
    bali_progress_end(&progress);
    bali_progress_end(&progress);
    (void)snprintf(wiped, sizeof wiped, "%s", seen(&screen));
    leave_terminal(&screen);

    char wanted[200];
    ck_assert_str_eq(first, "");
    (void)snprintf(wanted, sizeof wanted, "\r%-40s", "reading 50 %");
    ck_assert_str_eq(second, wanted);
    (void)snprintf(wanted, sizeof wanted, "\r%-40s", "reading 1234567");
    ck_assert_str_eq(third, wanted);
    (void)snprintf(wanted, sizeof wanted, "\r%40s\r", "");
    ck_assert_str_eq(wiped, wanted);
}
END_TEST

static const struct {
    uint64_t done, total;
    const char *shown;
} shares[] = {
    {0, 7, "x 0 %"}, {7, 7, "x 100 %"}, {8, 7, "x 100 %"}, {999, 1000, "x 99 %"}, {UINT64_MAX, UINT64_MAX, "x 100 %"},
    {UINT64_MAX / 2, UINT64_MAX, "x 50 %"},
};

START_TEST(shares_are_right_for_any_size) {
    struct screen screen = on_terminal(NULL);
    bali_progress progress;
    bali_progress_start(&progress, "x", false);
    progress.started -= 2;
    bali_progress_step(&progress, shares[_i].done, shares[_i].total);
    char shown[200], wanted[200];
    (void)snprintf(shown, sizeof shown, "%s", seen(&screen));
    leave_terminal(&screen);
    (void)snprintf(wanted, sizeof wanted, "\r%-40s", shares[_i].shown);
    ck_assert_str_eq(shown, wanted);
}
END_TEST

static void run_a_while(bool quiet) {
    bali_progress progress;
    bali_progress_start(&progress, "reading", quiet);
    progress.started -= 2;
    bali_progress_step(&progress, 5, 10);
    bali_progress_end(&progress);
}

START_TEST(quiet_and_dumb_terminals_see_nothing) {
    struct screen screen = on_terminal(_i ? "dumb" : "xterm");
    run_a_while(_i == 0);
    char shown[200];
    (void)snprintf(shown, sizeof shown, "%s", seen(&screen));
    leave_terminal(&screen);
    ck_assert_str_eq(shown, "");
}
END_TEST

START_TEST(a_file_gets_nothing) {
    (void)setenv("TERM", "xterm", 1);
    const char *path = scratch_file("stderr", "", 0);
    int kept = dup(STDERR_FILENO), file = open(path, O_WRONLY);
    (void)dup2(file, STDERR_FILENO);
    run_a_while(false);
    off_t length = lseek(file, 0, SEEK_END);
    (void)dup2(kept, STDERR_FILENO);
    (void)close(kept);
    (void)close(file);
    ck_assert_int_eq(length, 0);
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("progress");
    TCase *tests = tcase_create("progress");
    tcase_add_test(tests, a_terminal_sees_progress_and_then_a_clean_line);
    tcase_add_loop_test(tests, shares_are_right_for_any_size, 0, (int)(sizeof shares / sizeof shares[0]));
    tcase_add_loop_test(tests, quiet_and_dumb_terminals_see_nothing, 0, 2);
    tcase_add_test(tests, a_file_gets_nothing);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
