#include "base/memory.h"
#include "base/output.h"
#include "base/scratch.h"
#include "support/harness.h"

#include <errno.h>
#include <fcntl.h>
#include <signal.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

START_TEST(a_new_file_appears_at_the_commit) {
    const char *name = in_scratch("new");
    int before = entries(), descriptors = open_descriptors();
    bali_output *output = NULL;
    bal_error err = {0};
    ck_assert_int_eq(bali_output_open(name, &output, &err), BAL_OK);
    ck_assert_int_eq(bali_output_write(output, "two ", 4, &err), BAL_OK);
    ck_assert_int_eq(bali_output_write(output, NULL, 0, &err), BAL_OK);
    ck_assert_int_eq(bali_output_write(output, "words", 5, &err), BAL_OK);
    ck_assert_str_eq(content(name), "(none)");
    ck_assert_int_eq(bali_output_commit(output, &err), BAL_OK);
    ck_assert_str_eq(content(name), "two words");
    ck_assert_int_eq(entries(), before + 1);
    ck_assert_int_eq(open_descriptors(), descriptors);
}
END_TEST

START_TEST(an_old_file_is_replaced_at_the_commit) {
    const char *name = old_file("kept until then");
    int before = entries();
    bali_output *output = NULL;
    ck_assert_int_eq(bali_output_open(name, &output, NULL), BAL_OK);
    ck_assert_int_eq(bali_output_write(output, "new", 3, NULL), BAL_OK);
    ck_assert_str_eq(content(name), "old");
    ck_assert_int_eq(bali_output_commit(output, NULL), BAL_OK);
    ck_assert_str_eq(content(name), "new");
    ck_assert_int_eq(entries(), before);
}
END_TEST

START_TEST(an_abandoned_output_leaves_nothing) {
    const char *name = old_file("abandoned");
    int before = entries(), descriptors = open_descriptors();
    bali_output *output = NULL;
    ck_assert_int_eq(bali_output_open(name, &output, NULL), BAL_OK);
    ck_assert_int_eq(bali_output_write(output, "new", 3, NULL), BAL_OK);
    bali_output_abandon(output);
    bali_output_abandon(NULL);
    ck_assert_str_eq(content(name), "old");
    ck_assert_int_eq(entries(), before);
    ck_assert_int_eq(open_descriptors(), descriptors);
}
END_TEST

/* Sizes around the buffer's 64 KiB, written in pieces. */
static const struct {
    size_t size, piece;
} amounts[] = {{0, 1},        {1, 1},      {65535, 65535},  {65536, 65536},  {65537, 65537},
               {65537, 1000}, {200000, 7}, {200000, 65536}, {200000, 100000}};

START_TEST(any_amount_arrives_whole) {
    static char bytes[200000];
    for (size_t i = 0; i < sizeof bytes; i++) bytes[i] = (char)('!' + i % 89);
    const char *name = in_scratch("amount");
    bali_output *output = NULL;
    ck_assert_int_eq(bali_output_open(name, &output, NULL), BAL_OK);
    for (size_t at = 0; at < amounts[_i].size;) {
        size_t piece = amounts[_i].size - at < amounts[_i].piece ? amounts[_i].size - at : amounts[_i].piece;
        ck_assert_int_eq(bali_output_write(output, bytes + at, piece, NULL), BAL_OK);
        at += piece;
    }
    ck_assert_int_eq(bali_output_commit(output, NULL), BAL_OK);
    const char *arrived = content(name);
    ck_assert_uint_eq(strlen(arrived), amounts[_i].size);
    ck_assert(memcmp(arrived, bytes, amounts[_i].size) == 0);
}
END_TEST

START_TEST(modes_are_kept_and_new_ones_follow_the_umask) {
    static const mode_t modes[] = {0640, 0600, 0777, 0444, 0660};
    mode_t before = umask(027);
    ck_assert_int_eq(bali_output_write_whole(in_scratch("fresh"), "x", 1, NULL), BAL_OK);
    ck_assert_uint_eq(mode_of(scratch_name), 0640);
    (void)umask(077);
    ck_assert_int_eq(bali_output_write_whole(in_scratch("closed"), "x", 1, NULL), BAL_OK);
    ck_assert_uint_eq(mode_of(scratch_name), 0600);
    for (size_t i = 0; i < sizeof modes / sizeof modes[0]; i++) {
        const char *name = old_file("moded");
        ck_assert_int_eq(chmod(name, modes[i]), 0);
        bool writable = access(name, W_OK) == 0; /* root may write to anything */
        ck_assert_int_eq(bali_output_write_whole(name, "new", 3, NULL), writable ? BAL_OK : BAL_ERR_IO);
        ck_assert_uint_eq(mode_of(name), modes[i]);
        ck_assert_int_eq(unlink(name), 0);
    }
    (void)umask(before);
}
END_TEST

START_TEST(owner_and_group_are_kept) {
    if (geteuid() != 0) {
        (void)puts("owner_and_group_are_kept: skipped: only root can give files away");
        return;
    }
    const char *name = old_file("owned");
    ck_assert(chown(name, 1234, 2345) == 0 && chmod(name, 04755) == 0);
    ck_assert_int_eq(bali_output_write_whole(name, "new", 3, NULL), BAL_OK);
    struct stat now;
    ck_assert_int_eq(stat(name, &now), 0);
    ck_assert(now.st_uid == 1234 && now.st_gid == 2345 && (now.st_mode & 07777) == 04755);
}
END_TEST

/* Runs a test's body in a process of its own as an ordinary user, who cannot do whatever he likes. */
static int as_ordinary_user(int (*body)(void)) {
    pid_t child = fork();
    if (child == 0) {
        if (geteuid() == 0 && (setgid(65534) != 0 || setuid(65534) != 0)) _exit(99);
        _exit(body());
    }
    int status = -1;
    ck_assert_int_eq(waitpid(child, &status, 0), child);
    return WIFEXITED(status) ? WEXITSTATUS(status) : -1;
}

static int replace_a_strangers_file(void) {
    return bali_output_write_whole(scratch_name, "new", 3, NULL) == BAL_OK ? 0 : 1;
}

START_TEST(a_group_that_cannot_be_kept_gets_no_more_than_everybody) {
    if (geteuid() != 0) {
        (void)puts("a_group_that_cannot_be_kept_gets_no_more_than_everybody: skipped: only root can give files away");
        return;
    }
    static const struct {
        mode_t before, after;
    } modes[] = {{0662, 0622}, {02676, 0666}, {04666, 0666}};
    const char *name = old_file("a stranger's");
    for (size_t i = 0; i < 3; i++) {
        ck_assert(chown(name, 1234, 2345) == 0 && chmod(name, modes[i].before) == 0 && chmod(scratch_dir(), 0777) == 0);
        ck_assert_int_eq(as_ordinary_user(replace_a_strangers_file), 0);
        ck_assert_uint_eq(mode_of(name), modes[i].after);
    }
}
END_TEST

START_TEST(a_link_is_kept_and_its_target_replaced) {
    static const char *const targets[] = {"target", "./target", NULL};
    char link_path[512], target[512];
    (void)snprintf(target, sizeof target, "%s/target", scratch_dir());
    const char *leads_to = targets[_i] ? targets[_i] : target;
    ck_assert_int_eq(symlink(leads_to, in_scratch("link")), 0);
    ck_assert_int_eq(symlink("link", in_scratch("link to link")), 0);
    (void)snprintf(link_path, sizeof link_path, "%s", scratch_name);
    for (int existing = 0; existing < 2; existing++) { /* at first the link dangles */
        const char *bytes = existing ? "second" : "first";
        ck_assert_int_eq(bali_output_write_whole(link_path, bytes, strlen(bytes), NULL), BAL_OK);
        ck_assert_str_eq(content(target), bytes);
        struct stat now;
        ck_assert(lstat(link_path, &now) == 0 && S_ISLNK(now.st_mode));
        ck_assert(lstat(in_scratch("link"), &now) == 0 && S_ISLNK(now.st_mode));
        ck_assert(lstat(target, &now) == 0 && S_ISREG(now.st_mode));
    }
    ck_assert(unlink(link_path) == 0 && unlink(in_scratch("link")) == 0 && unlink(target) == 0);
}
END_TEST

START_TEST(a_link_into_another_folder_is_followed_there) {
    char folder[600], target[700];
    (void)snprintf(folder, sizeof folder, "%s/folder", scratch_dir());
    (void)snprintf(target, sizeof target, "%s/target", folder);
    ck_assert_int_eq(mkdir(folder, 0755), 0);
    ck_assert_int_eq(symlink("folder/target", in_scratch("far link")), 0);
    ck_assert_int_eq(bali_output_write_whole(scratch_name, "there", 5, NULL), BAL_OK);
    ck_assert_str_eq(content(target), "there");
    ck_assert(unlink(target) == 0 && rmdir(folder) == 0); /* nothing else is in it */
}
END_TEST

/* Tries to write a file and expects to be refused at the opening, for this reason. */
static void refused(const char *name, int reason) {
    int before = entries(), descriptors = open_descriptors();
    bali_output *output = (bali_output *)1;
    bal_error err = {0};
    ck_assert_msg(bali_output_open(name, &output, &err) == BAL_ERR_IO, "%s", name);
    ck_assert_ptr_null(output);
    ck_assert_str_eq(err.code, "cannot-write");
    ck_assert_str_eq(err.file, name);
    ck_assert_msg(strstr(err.message, strerror(reason)) != NULL, "%s: %s", name, err.message);
    ck_assert_int_eq(bali_output_open(name, &output, NULL), BAL_ERR_IO);
    ck_assert_int_eq(entries(), before);
    ck_assert_int_eq(open_descriptors(), descriptors);
}

START_TEST(what_cannot_be_written_is_refused_at_once) {
    char long_name[300];
    memset(long_name, 'x', sizeof long_name);
    long_name[299] = '\0';
    refused("", ENOENT);
    refused(scratch_dir(), EISDIR);
    refused(".", EISDIR);
    refused("/", EISDIR);
    refused(in_scratch("no/such/folder"), ENOENT);
    refused(in_scratch("not yet there/"), EISDIR);
    refused(long_name, ENAMETOOLONG);
    (void)old_file("a file");
    refused(in_scratch("a file/beneath"), ENOTDIR);
    refused(in_scratch("a file/"), ENOTDIR);
    ck_assert_int_eq(symlink("around", in_scratch("around")), 0);
    refused(scratch_name, ELOOP);
    ck_assert_int_eq(symlink("no/such/place", in_scratch("far off")), 0);
    refused(scratch_name, ENOENT);
}
END_TEST

static int write_in_a_closed_folder(void) {
    bali_output *output = NULL;
    bal_error err = {0};
    bal_status status = bali_output_open(scratch_name, &output, &err);
    return status == BAL_ERR_IO && strstr(err.message, strerror(EACCES)) ? 0 : 1;
}

START_TEST(a_folder_or_file_without_permission_is_refused_at_once) {
    const char *name = old_file("protected");
    ck_assert(chmod(name, 0666) == 0 && chmod(scratch_dir(), 0555) == 0);
    if (geteuid() == 0) ck_assert_int_eq(as_ordinary_user(write_in_a_closed_folder), 0);
    ck_assert(chmod(name, 0444) == 0 && chmod(scratch_dir(), 0777) == 0);
    ck_assert_int_eq(as_ordinary_user(write_in_a_closed_folder), 0);
    ck_assert_str_eq(content(name), "old");
    ck_assert_int_eq(chmod(scratch_dir(), 0700), 0);
}
END_TEST

static int write_in_a_folder_that_cannot_be_listed(void) {
    return bali_output_write_whole(scratch_name, "new", 3, NULL) == BAL_OK ? 0 : 1;
}

START_TEST(a_folder_need_not_be_readable) {
    (void)in_scratch("dropped");
    ck_assert_int_eq(chmod(scratch_dir(), 0333), 0);
    int result = as_ordinary_user(write_in_a_folder_that_cannot_be_listed);
    ck_assert_int_eq(chmod(scratch_dir(), 0700), 0);
    ck_assert_int_eq(result, 0);
    ck_assert_str_eq(content(scratch_name), "new");
}
END_TEST

/* Names that lead to one file, or do not; "same" does not exist yet. */
static const struct {
    const char *a, *b;
    bool same;
} pairs[] = {
    {"same", "same", true},          {"same", "./same", true},           {"same", "to same", true}, {"same", "other", false},
    {"same", "folder/same", false},  {"same", "folder/../same", true},   {"/dev/null", "/dev/null", false},
};

START_TEST(two_names_of_one_output_are_known) {
    char names[2][600];
    (void)snprintf(names[0], sizeof names[0], "%s/folder", scratch_dir());
    ck_assert_int_eq(mkdir(names[0], 0755), 0);
    ck_assert_int_eq(symlink("same", in_scratch("to same")), 0);
    bali_output *outputs[2] = {NULL, NULL};
    for (int i = 0; i < 2; i++) {
        const char *given = i ? pairs[_i].b : pairs[_i].a;
        (void)snprintf(names[i], sizeof names[i], "%s%s%s", given[0] == '/' ? "" : scratch_dir(), given[0] == '/' ? "" : "/", given);
        ck_assert_int_eq(bali_output_open(names[i], &outputs[i], NULL), BAL_OK);
    }
    ck_assert_int_eq(bali_output_same(outputs[0], outputs[1]), pairs[_i].same);
    bali_output_abandon(outputs[0]);
    bali_output_abandon(outputs[1]);
    (void)snprintf(names[0], sizeof names[0], "%s/folder", scratch_dir());
    ck_assert(rmdir(names[0]) == 0 && unlink(in_scratch("to same")) == 0);
}
END_TEST

START_TEST(leftovers_in_the_way_are_passed_by) {
    char leftover[600];
    for (int i = 0; i < 3; i++) {
        (void)snprintf(leftover, sizeof leftover, ".ballast-%ld-%d", (long)getpid(), i);
        (void)scratch_file(leftover, "of somebody else", 16);
    }
    const char *name = old_file("beside leftovers");
    int before = entries();
    ck_assert_int_eq(bali_output_write_whole(name, "new", 3, NULL), BAL_OK);
    ck_assert_str_eq(content(name), "new");
    ck_assert_int_eq(entries(), before);
}
END_TEST

static bal_status write_old(void *context, bal_error *err) {
    int before = entries(), descriptors = open_descriptors();
    bali_output *output = (bali_output *)1;
    bal_status status = bali_output_open(context, &output, err);
    if (status != BAL_OK) ck_assert_ptr_null(output);
    if (status == BAL_OK) status = bali_output_write(output, "x", 1, err);
    if (status == BAL_OK) status = bali_output_commit(output, err);
    else bali_output_abandon(output);
    ck_assert_int_eq(entries(), before);
    ck_assert_int_eq(open_descriptors(), descriptors);
    return status;
}

START_TEST(no_memory_is_told) {
    (void)old_file("memory");
    ck_assert_int_eq(symlink("memory", in_scratch("memory link")), 0);
    ck_assert_uint_eq(survive_allocations(write_old, scratch_name), 6); /* three names, buffer, the link followed, its folder */
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("output");
    TCase *tests = tcase_create("output");
    tcase_set_timeout(tests, 60);
    tcase_add_test(tests, a_new_file_appears_at_the_commit);
    tcase_add_test(tests, an_old_file_is_replaced_at_the_commit);
    tcase_add_test(tests, an_abandoned_output_leaves_nothing);
    tcase_add_loop_test(tests, any_amount_arrives_whole, 0, (int)(sizeof amounts / sizeof amounts[0]));
    tcase_add_test(tests, modes_are_kept_and_new_ones_follow_the_umask);
    tcase_add_test(tests, owner_and_group_are_kept);
    tcase_add_test(tests, a_group_that_cannot_be_kept_gets_no_more_than_everybody);
    tcase_add_loop_test(tests, a_link_is_kept_and_its_target_replaced, 0, 3);
    tcase_add_test(tests, a_link_into_another_folder_is_followed_there);
    tcase_add_test(tests, what_cannot_be_written_is_refused_at_once);
    tcase_add_test(tests, a_folder_or_file_without_permission_is_refused_at_once);
    tcase_add_test(tests, a_folder_need_not_be_readable);
    tcase_add_loop_test(tests, two_names_of_one_output_are_known, 0, (int)(sizeof pairs / sizeof pairs[0]));
    tcase_add_test(tests, leftovers_in_the_way_are_passed_by);
    tcase_add_test(tests, no_memory_is_told);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
