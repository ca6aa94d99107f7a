#include "base/files.h"
#include "base/memory.h"
#include "base/scratch.h"
#include "support/harness.h"

#include <errno.h>
#include <fcntl.h>
#include <pthread.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

static char path[512], other[512];

static const char *scratch_path(char *to, size_t size, const char *name) {
    (void)snprintf(to, size, "%s/%s", scratch_dir(), name);
    return to;
}

static void pause_milliseconds(long milliseconds) {
    struct timespec time = {.tv_nsec = milliseconds * 1000000};
    (void)nanosleep(&time, NULL);
}

START_TEST(a_file_is_read_in_pieces) {
    (void)scratch_path(path, sizeof path, "pieces.csv");
    (void)scratch_file("pieces.csv", "abcdefghij", 10);
    int before = open_descriptors();
    bali_input *input = NULL;
    bal_error err = {0};
    ck_assert_int_eq(bali_input_open(path, &input, &err), BAL_OK);
    ck_assert_str_eq(bali_input_name(input), path);
    ck_assert_str_eq(bali_input_base_name(input), "pieces.csv");
    ck_assert(bali_input_can_rewind(input));
    ck_assert_uint_eq(bali_input_size(input), 10);
    for (int pass = 0; pass < 2; pass++) {
        char bytes[16];
        size_t length;
        static const struct {
            size_t size;
            const char *bytes;
        } reads[] = {{4, "abcd"}, {0, ""}, {4, "efgh"}, {4, "ij"}, {4, ""}, {4, ""}};
        uint64_t position = 0;
        for (size_t i = 0; i < sizeof reads / sizeof reads[0]; i++) {
            ck_assert_int_eq(bali_input_read(input, bytes, reads[i].size, &length, &err), BAL_OK);
            ck_assert_uint_eq(length, strlen(reads[i].bytes));
            ck_assert(memcmp(bytes, reads[i].bytes, length) == 0);
            position += length;
            ck_assert_uint_eq(bali_input_position(input), position);
        }
        ck_assert_int_eq(bali_input_rewind(input, &err), BAL_OK);
        ck_assert_uint_eq(bali_input_position(input), 0);
    }
    bali_input_close(input);
    bali_input_close(NULL);
    ck_assert_int_eq(open_descriptors(), before);
}
END_TEST

static void cannot_open(const char *name, int reason) {
    int before = open_descriptors();
    bali_input *input = (bali_input *)1;
    bal_error err = {0};
    ck_assert_int_eq(bali_input_open(name, &input, &err), BAL_ERR_IO);
    ck_assert_ptr_null(input);
    ck_assert_str_eq(err.code, "cannot-open");
    ck_assert_str_eq(err.file, name);
    ck_assert_msg(strstr(err.message, strerror(reason)) != NULL, "%s: %s", name, err.message);
    ck_assert_int_eq(bali_input_open(name, &input, NULL), BAL_ERR_IO);

    char *bytes = (char *)1;
    size_t length = 42;
    ck_assert_int_eq(bali_read_whole(name, 100, &bytes, &length, NULL), BAL_ERR_IO);
    ck_assert_ptr_null(bytes);
    ck_assert_int_eq(open_descriptors(), before);
}

START_TEST(what_cannot_be_opened_is_named) {
    cannot_open("", ENOENT);
    cannot_open(scratch_dir(), EISDIR);
    cannot_open(scratch_path(path, sizeof path, "no such file"), ENOENT);
    cannot_open(scratch_path(path, sizeof path, "a\n\033[31m\xFF.csv"), ENOENT);
    cannot_open("https://example.org/network.xml", ENOENT);
    cannot_open("file:///etc/hostname", ENOENT);
    (void)scratch_file("a file", "", 0);
    cannot_open(scratch_path(path, sizeof path, "a file/beneath"), ENOTDIR);
    char long_name[400];
    memset(long_name, 'x', sizeof long_name);
    long_name[399] = '\0';
    cannot_open(long_name, ENAMETOOLONG);
    ck_assert_int_eq(symlink("loop", scratch_path(path, sizeof path, "loop")), 0);
    cannot_open(path, ELOOP);
}
END_TEST

START_TEST(no_permission_is_told) {
    (void)scratch_path(path, sizeof path, "secret.csv");
    (void)scratch_file("secret.csv", "x", 1);
    ck_assert_int_eq(chmod(path, 0), 0);
    ck_assert_int_eq(chmod(scratch_dir(), 0755), 0);
    pid_t child = fork();
    if (child == 0) {
        if (geteuid() == 0 && setuid(65534) != 0) _exit(2); /* root may read everything */
        bali_input *input = NULL;
        bal_error err = {0};
        bal_status status = bali_input_open(path, &input, &err);
        _exit(status == BAL_ERR_IO && strstr(err.message, strerror(EACCES)) ? 0 : 1);
    }
    int status = -1;
    ck_assert_int_eq(waitpid(child, &status, 0), child);
    ck_assert_int_eq(status, 0);
}
END_TEST

START_TEST(an_earlier_failure_keeps_its_place) {
    bal_error err = {0};
    (void)bal_error_set(&err, BAL_ERR_DATA, "first", "first");
    bali_input *input = NULL;
    ck_assert_int_eq(bali_input_open("/no/such/file", &input, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.file, "");
    ck_assert_str_eq(err.message, "first");
}
END_TEST

/* Lets a file stand as standard input, as a shell would, from the offset on. */
static int swap_standard_input(int descriptor) {
    int kept = dup(STDIN_FILENO);
    (void)dup2(descriptor, STDIN_FILENO);
    (void)close(descriptor);
    return kept;
}

static void restore_standard_input(int kept) {
    (void)dup2(kept, STDIN_FILENO);
    (void)close(kept);
}

START_TEST(standard_input_is_read_from_where_it_stands) {
    (void)scratch_path(path, sizeof path, "input");
    (void)scratch_file("input", "headrest", 8);
    int descriptor = open(path, O_RDONLY);
    ck_assert_int_eq(lseek(descriptor, 4, SEEK_SET), 4);
    int kept = swap_standard_input(descriptor);
    bali_input *input = NULL;
    char bytes[16];
    size_t length;
    ck_assert_int_eq(bali_input_open("-", &input, NULL), BAL_OK);
    ck_assert_str_eq(bali_input_name(input), "standard input");
    ck_assert_str_eq(bali_input_base_name(input), "standard input");
    for (int pass = 0; pass < 2; pass++) {
        ck_assert_int_eq(bali_input_read(input, bytes, sizeof bytes, &length, NULL), BAL_OK);
        ck_assert(length == 4 && memcmp(bytes, "rest", 4) == 0);
        ck_assert_int_eq(bali_input_rewind(input, NULL), BAL_OK);
    }
    bali_input_close(input);
    ck_assert_int_ge(fcntl(STDIN_FILENO, F_GETFD), 0); /* it is not ours to close */
    restore_standard_input(kept);
}
END_TEST

START_TEST(standard_input_may_be_a_folder_or_closed) {
    bali_input *input = NULL;
    bal_error err = {0}, closed = {0};
    int kept = swap_standard_input(open(scratch_dir(), O_RDONLY));
    bal_status of_folder = bali_input_open("-", &input, &err);
    (void)close(STDIN_FILENO);
    bal_status of_closed = bali_input_open("-", &input, &closed);
    restore_standard_input(kept);
    ck_assert_int_eq(of_folder, BAL_ERR_IO);
    ck_assert_int_eq(of_closed, BAL_ERR_IO);
    ck_assert_str_eq(err.file, "standard input");
    ck_assert(strstr(err.message, strerror(EISDIR)) && strstr(closed.message, strerror(EBADF)));
}
END_TEST

static void on_alarm(int number) {
    (void)number;
}

typedef struct slow_writer {
    const char *path;
    const char *bytes;
    pthread_t reader;
} slow_writer;

/* Writes byte after byte, and interrupts the reader's system calls between them. */
static void *write_slowly(void *context) {
    slow_writer *writer = context;
    int descriptor = open(writer->path, O_WRONLY);
    for (const char *byte = writer->bytes; *byte; byte++) {
        pause_milliseconds(2);
        (void)pthread_kill(writer->reader, SIGUSR1);
        if (write(descriptor, byte, 1) != 1) break;
    }
    (void)close(descriptor);
    return NULL;
}

static void start_slow_writer(slow_writer *writer, pthread_t *thread) {
    struct sigaction action = {.sa_handler = on_alarm}; /* no SA_RESTART: read() ends with EINTR */
    (void)sigaction(SIGUSR1, &action, NULL);
    writer->reader = pthread_self();
    ck_assert_int_eq(pthread_create(thread, NULL, write_slowly, writer), 0);
}

START_TEST(a_slow_pipe_is_read_to_its_end) {
    ck_assert_int_eq(mkfifo(scratch_path(path, sizeof path, "fifo"), 0600), 0);
    slow_writer writer = {.path = path, .bytes = "age,smoker\n41,yes\n"};
    pthread_t thread;
    start_slow_writer(&writer, &thread);
    bali_input *input = NULL;
    bal_error err = {0};
    char bytes[100];
    size_t length;
    ck_assert_int_eq(bali_input_open(path, &input, &err), BAL_OK);
    ck_assert(!bali_input_can_rewind(input));
    ck_assert_int_eq(bali_input_read(input, bytes, 5, &length, &err), BAL_OK);
    ck_assert(length == 5 && memcmp(bytes, "age,s", 5) == 0);
    ck_assert_int_eq(bali_input_read(input, bytes, sizeof bytes, &length, &err), BAL_OK);
    ck_assert(length == 13 && memcmp(bytes, "moker\n41,yes\n", 13) == 0);
    ck_assert_uint_eq(bali_input_position(input), 18);
    ck_assert_int_eq(bali_input_rewind(input, &err), BAL_ERR_IO);
    ck_assert_str_eq(err.code, "cannot-reread");
    ck_assert_str_eq(err.file, path);
    bali_input_close(input);
    (void)pthread_join(thread, NULL);
}
END_TEST

/* What happens to a file behind our back, and whether that must be noticed. */
static void grow(void) {
    int descriptor = open(path, O_WRONLY | O_APPEND);
    ck_assert_int_eq(write(descriptor, "more", 4), 4);
    (void)close(descriptor);
}

static void shrink(void) {
    ck_assert_int_eq(truncate(path, 3), 0);
}

static void touch(void) {
    const struct timespec times[2] = {{.tv_nsec = UTIME_OMIT}, {.tv_sec = 1000}};
    ck_assert_int_eq(utimensat(AT_FDCWD, path, times, 0), 0);
}

static void replace(void) {
    (void)scratch_file("new", "NEW BYTES!", 10);
    ck_assert_int_eq(rename(scratch_path(other, sizeof other, "new"), path), 0);
}

static void look(void) {
    const struct timespec times[2] = {{.tv_sec = 1000}, {.tv_nsec = UTIME_OMIT}};
    ck_assert_int_eq(utimensat(AT_FDCWD, path, times, 0), 0);
}

static const struct {
    void (*happens)(void);
    bool noticed;
} changes[] = {{grow, true}, {shrink, true}, {touch, true}, {replace, false}, {look, false}};

START_TEST(a_file_that_changes_is_noticed) {
    (void)scratch_path(path, sizeof path, "changing");
    (void)scratch_file("changing", "abcdefghij", 10);
    bali_input *input = NULL;
    bal_error err = {0};
    char bytes[32];
    size_t length = 0;
    ck_assert_int_eq(bali_input_open(path, &input, &err), BAL_OK);
    ck_assert_int_eq(bali_input_read(input, bytes, 5, &length, &err), BAL_OK);
    changes[_i].happens();
    bal_status status = bali_input_read(input, bytes + 5, sizeof bytes - 5, &length, &err);
    if (changes[_i].noticed) {
        ck_assert_int_eq(status, BAL_ERR_DATA);
        ck_assert_str_eq(err.code, "changed-while-read");
        ck_assert_str_eq(err.file, path);
    } else { /* all of it is of the file that was opened */
        ck_assert_int_eq(status, BAL_OK);
        ck_assert(length == 5 && memcmp(bytes, "abcdefghij", 10) == 0);
    }
    bali_input_close(input);
}
END_TEST

START_TEST(a_change_between_two_passes_is_noticed) {
    (void)scratch_path(path, sizeof path, "twice");
    (void)scratch_file("twice", "abcdefghij", 10);
    bali_input *input = NULL;
    bal_error err = {0};
    char bytes[32];
    size_t length;
    ck_assert_int_eq(bali_input_open(path, &input, &err), BAL_OK);
    ck_assert_int_eq(bali_input_read(input, bytes, sizeof bytes, &length, &err), BAL_OK);
    grow();
    ck_assert_int_eq(bali_input_rewind(input, &err), BAL_OK);
    ck_assert_int_eq(bali_input_read(input, bytes, sizeof bytes, &length, &err), BAL_ERR_DATA);
    bali_input_close(input);
}
END_TEST

START_TEST(a_reading_error_is_told) {
    /* /proc/self/mem begins with a page that nobody has: reading there is EIO (proc(5)). */
    bali_input *input = NULL;
    bal_error err = {0};
    char bytes[8];
    size_t length;
    ck_assert_int_eq(bali_input_open("/proc/self/mem", &input, &err), BAL_OK);
    ck_assert_int_eq(bali_input_read(input, bytes, sizeof bytes, &length, &err), BAL_ERR_IO);
    ck_assert_str_eq(err.code, "cannot-read");
    ck_assert_msg(strstr(err.message, strerror(EIO)) != NULL, "%s", err.message);
    bali_input_close(input);
}
END_TEST

static const struct {
    size_t size, limit;
} wholes[] = {{0, 0},          {0, 10},         {10, 10},         {10, 11},           {11, 10},        {1, 0},
              {10, SIZE_MAX},  {65536, 65536},  {65537, 1 << 20}, {65535, SIZE_MAX},  {300000, 300000}, {300000, 299999}};

static char expected[300000];

START_TEST(a_whole_file_is_read_up_to_a_limit) {
    size_t size = wholes[_i].size, length = 42;
    for (size_t i = 0; i < sizeof expected; i++) expected[i] = (char)('a' + i % 23);
    (void)scratch_path(path, sizeof path, "whole");
    (void)scratch_file("whole", expected, size);
    int before = open_descriptors();
    char *bytes = NULL;
    bal_error err = {0};
    bal_status status = bali_read_whole(path, wholes[_i].limit, &bytes, &length, &err);
    if (size > wholes[_i].limit) {
        ck_assert_int_eq(status, BAL_ERR_DATA);
        ck_assert_str_eq(err.code, "file-too-large");
        ck_assert_str_eq(err.file, path);
        ck_assert(!bytes && length == 0);
    } else {
        ck_assert_int_eq(status, BAL_OK);
        ck_assert(length == size && memcmp(bytes, expected, size) == 0 && bytes[size] == '\0');
    }
    bali_free(bytes);
    ck_assert_int_eq(open_descriptors(), before);
}
END_TEST

/* Sends the first size bytes of expected through a pipe that stands as standard input. */
static void *send(void *context) {
    const int *ends = context;
    for (size_t at = 0; at < sizeof expected;) {
        size_t piece = sizeof expected - at < 7001 ? sizeof expected - at : 7001;
        ssize_t sent = write(ends[1], expected + at, piece);
        if (sent <= 0) break;
        at += (size_t)sent;
    }
    (void)close(ends[1]);
    return NULL;
}

START_TEST(a_pipe_is_read_whole) {
    static const size_t limits[] = {sizeof expected, sizeof expected - 1, 1 << 20, 10};
    memset(expected, 'y', sizeof expected);
    (void)signal(SIGPIPE, SIG_IGN);
    int ends[2];
    ck_assert_int_eq(pipe(ends), 0);
    int kept = swap_standard_input(ends[0]);
    pthread_t thread;
    ck_assert_int_eq(pthread_create(&thread, NULL, send, ends), 0);
    char *bytes = NULL;
    size_t length = 42;
    bal_error err = {0};
    bal_status status = bali_read_whole("-", limits[_i], &bytes, &length, &err);
    restore_standard_input(kept);
    (void)pthread_join(thread, NULL);
    if (limits[_i] >= sizeof expected) {
        ck_assert_int_eq(status, BAL_OK);
        ck_assert(length == sizeof expected && memcmp(bytes, expected, length) == 0);
    } else {
        ck_assert_int_eq(status, BAL_ERR_DATA);
        ck_assert_str_eq(err.code, "file-too-large");
        ck_assert_str_eq(err.file, "standard input");
    }
    bali_free(bytes);
}
END_TEST

START_TEST(endless_input_stops_at_the_limit) {
    char *bytes = NULL;
    size_t length;
    bal_error err = {0};
    ck_assert_int_eq(bali_read_whole("/dev/zero", 1 << 20, &bytes, &length, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "file-too-large");
    ck_assert_ptr_null(bytes);
}
END_TEST

START_TEST(a_file_that_does_not_tell_its_size_is_read_whole) {
    /* Files of /proc say that they are empty, and are not. */
    char *bytes = NULL;
    size_t length;
    ck_assert_int_eq(bali_read_whole("/proc/self/status", 1 << 20, &bytes, &length, NULL), BAL_OK);
    ck_assert_uint_gt(length, 100);
    ck_assert_ptr_nonnull(strstr(bytes, "Pid:"));
    bali_free(bytes);
}
END_TEST

static bal_status read_whole(void *context, bal_error *err) {
    char *bytes = (char *)1;
    size_t length = 42;
    bal_status status = bali_read_whole(context, 1 << 20, &bytes, &length, err);
    if (status != BAL_OK) ck_assert(!bytes && length == 0);
    bali_free(bytes);
    return status;
}

static bal_status read_pipe(void *context, bal_error *err) {
    int ends[2];
    pthread_t thread;
    ck_assert_int_eq(pipe(ends), 0);
    int kept = swap_standard_input(ends[0]);
    ck_assert_int_eq(pthread_create(&thread, NULL, send, ends), 0);
    bal_status status = read_whole(context, err);
    restore_standard_input(kept);
    (void)pthread_join(thread, NULL);
    return status;
}

START_TEST(no_memory_is_told) {
    (void)signal(SIGPIPE, SIG_IGN);
    int before = open_descriptors();
    memset(expected, 'x', sizeof expected);
    (void)scratch_file("memory", expected, sizeof expected);
    ck_assert_uint_eq(survive_allocations(read_whole, (void *)scratch_path(path, sizeof path, "memory")), 3); /* in one piece */
    ck_assert_uint_eq(survive_allocations(read_pipe, (void *)"-"), 6); /* grows three times from 64 KiB */
    ck_assert_int_eq(open_descriptors(), before);
}
END_TEST

static const struct {
    const char *path, *base;
} bases[] = {{"a.xml", "a.xml"}, {"/home/x/a.xml", "a.xml"}, {"../a", "a"}, {"-", "standard input"}, {"dir/", ""}, {"", ""}, {"x/-", "-"}};

START_TEST(a_base_name_is_never_a_path) {
    ck_assert_str_eq(bali_base_name(bases[_i].path), bases[_i].base);
}
END_TEST

START_TEST(one_file_by_two_names_is_known) {
    char link_path[512], hard[512];
    (void)scratch_file("same", "x", 1);
    (void)scratch_file("different", "x", 1);
    (void)scratch_path(path, sizeof path, "same");
    (void)scratch_path(other, sizeof other, "different");
    ck_assert_int_eq(symlink("same", scratch_path(link_path, sizeof link_path, "symbolic")), 0);
    ck_assert_int_eq(link(path, scratch_path(hard, sizeof hard, "hard")), 0);
    ck_assert(bali_same_file(path, path));
    ck_assert(bali_same_file(path, link_path));
    ck_assert(bali_same_file(hard, link_path));
    ck_assert(!bali_same_file(path, other));
    ck_assert(!bali_same_file(path, "/no/such/file"));
    ck_assert(!bali_same_file("/no/such/file", "/no/such/file"));
    ck_assert(!bali_same_file("-", "-"));
}
END_TEST

static bool never(const char *bytes, size_t length) {
    return length == 0 || bytes[0] != '\0';
}

/* An endless file is not read for ever where its first bytes tell enough. */
START_TEST(reading_goes_on_while_it_is_worth_it) {
    char *bytes = NULL;
    size_t length = 0;
    bal_error err = {0};
    ck_assert_int_eq(bali_read_while("/dev/zero", (size_t)1 << 30, never, &bytes, &length, &err), BAL_OK);
    ck_assert_uint_gt(length, 0);
    ck_assert_uint_lt(length, 1 << 20);
    bali_free(bytes);
    ck_assert_int_eq(bali_read_while("/dev/zero", 1 << 20, NULL, &bytes, &length, &err), BAL_ERR_DATA);
    ck_assert_ptr_null(bytes);
    ck_assert_str_eq(err.code, "file-too-large");
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("files");
    TCase *tests = tcase_create("files");
    tcase_set_timeout(tests, 30);
    tcase_add_test(tests, a_file_is_read_in_pieces);
    tcase_add_test(tests, what_cannot_be_opened_is_named);
    tcase_add_test(tests, no_permission_is_told);
    tcase_add_test(tests, an_earlier_failure_keeps_its_place);
    tcase_add_test(tests, standard_input_is_read_from_where_it_stands);
    tcase_add_test(tests, standard_input_may_be_a_folder_or_closed);
    tcase_add_test(tests, a_slow_pipe_is_read_to_its_end);
    tcase_add_loop_test(tests, a_file_that_changes_is_noticed, 0, (int)(sizeof changes / sizeof changes[0]));
    tcase_add_test(tests, a_change_between_two_passes_is_noticed);
    tcase_add_test(tests, a_reading_error_is_told);
    tcase_add_loop_test(tests, a_whole_file_is_read_up_to_a_limit, 0, (int)(sizeof wholes / sizeof wholes[0]));
    tcase_add_loop_test(tests, a_pipe_is_read_whole, 0, 4);
    tcase_add_test(tests, endless_input_stops_at_the_limit);
    tcase_add_test(tests, a_file_that_does_not_tell_its_size_is_read_whole);
    tcase_add_test(tests, no_memory_is_told);
    tcase_add_loop_test(tests, a_base_name_is_never_a_path, 0, (int)(sizeof bases / sizeof bases[0]));
    tcase_add_test(tests, one_file_by_two_names_is_known);
    tcase_add_test(tests, reading_goes_on_while_it_is_worth_it);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
