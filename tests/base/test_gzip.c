#include "base/gzip.h"

#include "base/memory.h"
#include "support/harness.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>
#include <zlib.h>

/* Bytes compressed by zlib, the general library, into one gzip member behind what is there. */
static void add_member(const void *bytes, size_t length, unsigned char *packed, size_t *n, size_t room) {
    z_stream stream = {0};
    ck_assert_int_eq(deflateInit2(&stream, 9, Z_DEFLATED, 15 + 16, 8, Z_DEFAULT_STRATEGY), Z_OK);
    stream.next_in = (Bytef *)bytes;
    stream.avail_in = (uInt)length;
    stream.next_out = packed + *n;
    stream.avail_out = (uInt)(room - *n);
    ck_assert_int_eq(deflate(&stream, Z_FINISH), Z_STREAM_END);
    *n = room - stream.avail_out;
    deflateEnd(&stream);
}

enum { ROOM = 1 << 16 };

typedef struct member {
    unsigned char bytes[ROOM];
    size_t n;
} packed_file;

static void add_text(packed_file *file, const char *text) {
    add_member(text, strlen(text), file->bytes, &file->n, ROOM);
}

typedef struct seen {
    char bytes[ROOM];
    size_t n;
} seen;

static void see(void *context, const char *bytes, size_t length) {
    seen *s = context;
    ck_assert(s->n + length <= ROOM);
    memcpy(s->bytes + s->n, bytes, length);
    s->n += length;
}

/* Reads all of a file in pieces; *n is how many bytes came. */
static bal_status read_all(bali_gzip *gzip, size_t piece, char *text, size_t *n, bal_error *err) {
    size_t got = piece;
    bal_status status = BAL_OK;
    *n = 0;
    while (status == BAL_OK && got == piece) {
        ck_assert(*n + piece <= ROOM);
        status = bali_gzip_read(gzip, text + *n, piece, &got, err);
        *n += got;
    }
    return status;
}

static bal_status read_bytes(const void *bytes, size_t length, size_t piece, char *text, size_t *n, bal_error *err) {
    bali_input *input = NULL;
    bali_gzip *gzip = NULL;
    *n = 0;
    bal_status status = bali_input_open(scratch_file("packed", bytes, length), &input, err);
    if (status == BAL_OK) status = bali_gzip_create(input, (bali_gzip_watch){0}, &gzip, err);
    if (status == BAL_OK) status = read_all(gzip, piece, text, n, err);
    bali_gzip_free(gzip);
    bali_input_close(input);
    return status;
}

static const size_t pieces[] = {1, 2, 3, 7, 4096};

START_TEST(members_come_out_one_after_another) {
    packed_file file = {.n = 0};
    char text[ROOM];
    size_t n;
    add_text(&file, "smoker,age\nno,");
    add_text(&file, "");
    add_text(&file, "old\n");
    ck_assert_int_eq(read_bytes(file.bytes, file.n, pieces[_i], text, &n, NULL), BAL_OK);
    ck_assert_uint_eq(n, 18);
    ck_assert(memcmp(text, "smoker,age\nno,old\n", n) == 0);
}
END_TEST

START_TEST(other_bytes_come_through) {
    static const char *const plain[] = {"", "\x1F", "a", "\x1F,\x8B", "smoker\nno\n"};
    char text[ROOM];
    for (size_t i = 0; i < sizeof plain / sizeof plain[0]; i++) {
        size_t n;
        ck_assert_int_eq(read_bytes(plain[i], strlen(plain[i]), pieces[_i], text, &n, NULL), BAL_OK);
        ck_assert_uint_eq(n, strlen(plain[i]));
        ck_assert(memcmp(text, plain[i], n) == 0);
    }
}
END_TEST

/* Cut anywhere, the data are refused; the whole file's name and the byte are told. */
START_TEST(what_is_cut_short_is_refused) {
    packed_file file = {.n = 0};
    char text[ROOM];
    size_t n, first;
    add_text(&file, "smoker,age\nno,old\n");
    first = file.n;
    add_text(&file, "yes,old\n");
    for (size_t length = 2; length < file.n; length++) {
        bal_error err = {0};
        bal_status status = read_bytes(file.bytes, length, pieces[_i], text, &n, &err);
        if (length == first) {
            ck_assert_int_eq(status, BAL_OK);
            continue;
        }
        ck_assert_int_eq(status, BAL_ERR_SYNTAX);
        ck_assert_str_eq(err.code, "bad-gzip");
        ck_assert_ptr_nonnull(strstr(err.file, "packed"));
        ck_assert_ptr_nonnull(strstr(err.message, "byte"));
    }
}
END_TEST

/* One bit changed anywhere behind the header is noticed, by the sum at the end if not before (RFC 1952, 2.3.1); only the few bits that
 * fill up the last byte of the data mean nothing (RFC 1951, 3.2.4). */
START_TEST(damage_is_refused) {
    static const char plain[] = "smoker,age\nno,old\nno,old\nyes,young\n";
    packed_file file = {.n = 0};
    char text[ROOM];
    size_t n;
    size_t unnoticed = 0;
    add_text(&file, plain);
    for (size_t bit = 10 * 8; bit < file.n * 8; bit++) {
        bal_error err = {0};
        file.bytes[bit / 8] ^= (unsigned char)(1 << bit % 8);
        if (read_bytes(file.bytes, file.n, 4096, text, &n, &err) == BAL_OK) {
            ck_assert(n == strlen(plain) && memcmp(text, plain, n) == 0);
            unnoticed++;
        } else {
            ck_assert_str_eq(err.code, "bad-gzip");
        }
        file.bytes[bit / 8] ^= (unsigned char)(1 << bit % 8);
    }
    ck_assert_uint_lt(unnoticed, 8);
    memcpy(file.bytes + file.n, "more", 4);
    bal_error err = {0};
    ck_assert_int_eq(read_bytes(file.bytes, file.n + 4, pieces[_i], text, &n, &err), BAL_ERR_SYNTAX);
    ck_assert_ptr_nonnull(strstr(err.message, "something else stands behind"));
}
END_TEST

/* Zeros grow more than a thousandfold: the reading stops soon after the ten free megabytes. */
START_TEST(a_bomb_is_refused_soon) {
    enum { ZEROS = 64 << 20 };
    char *zeros = calloc(ZEROS, 1), *text = malloc(1 << 18);
    unsigned char *packed = malloc(1 << 20);
    size_t n = 0, got = 1;
    uint64_t given = 0;
    add_member(zeros, ZEROS, packed, &n, 1 << 20);
    bali_input *input = NULL;
    bali_gzip *gzip = NULL;
    bal_error err = {0};
    ck_assert_int_eq(bali_input_open(scratch_file("bomb", packed, n), &input, NULL), BAL_OK);
    ck_assert_int_eq(bali_gzip_create(input, (bali_gzip_watch){0}, &gzip, NULL), BAL_OK);
    bal_status status = BAL_OK;
    for (; status == BAL_OK && got > 0; given += got) status = bali_gzip_read(gzip, text, 1 << 18, &got, &err);
    ck_assert_int_eq(status, BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "gzip-ratio");
    ck_assert(given > BALI_GZIP_FREE_BYTES && given < BALI_GZIP_FREE_BYTES + (1 << 18));
    bali_gzip_free(gzip);
    bali_input_close(input);
    free(zeros);
    free(text);
    free(packed);
}
END_TEST

/* A small file may grow as it likes. */
START_TEST(ten_megabytes_are_free) {
    enum { ZEROS = 9 << 20 };
    char *zeros = calloc(ZEROS, 1), *text = malloc(ZEROS + 1);
    unsigned char *packed = malloc(1 << 20);
    size_t n = 0, got;
    add_member(zeros, ZEROS, packed, &n, 1 << 20);
    bali_input *input = NULL;
    bali_gzip *gzip = NULL;
    ck_assert_int_eq(bali_input_open(scratch_file("zeros", packed, n), &input, NULL), BAL_OK);
    ck_assert_int_eq(bali_gzip_create(input, (bali_gzip_watch){0}, &gzip, NULL), BAL_OK);
    ck_assert_int_eq(bali_gzip_read(gzip, text, ZEROS + 1, &got, NULL), BAL_OK);
    ck_assert_uint_eq(got, ZEROS);
    bali_gzip_free(gzip);
    bali_input_close(input);
    free(zeros);
    free(text);
    free(packed);
}
END_TEST

START_TEST(the_medium_is_seen_as_it_is_and_read_again) {
    packed_file file = {.n = 0};
    char text[ROOM], again[ROOM];
    seen medium = {.n = 0};
    size_t n, n_again;
    add_text(&file, "smoker,age\nno,old\n");
    bali_input *input = NULL;
    bali_gzip *gzip = NULL;
    ck_assert_int_eq(bali_input_open(scratch_file("packed", file.bytes, file.n), &input, NULL), BAL_OK);
    ck_assert_int_eq(bali_gzip_create(input, (bali_gzip_watch){see, &medium}, &gzip, NULL), BAL_OK);
    ck_assert_int_eq(read_all(gzip, pieces[_i], text, &n, NULL), BAL_OK);
    ck_assert_uint_eq(medium.n, file.n);
    ck_assert(memcmp(medium.bytes, file.bytes, file.n) == 0);
    ck_assert_uint_eq(bali_input_position(input), file.n);
    ck_assert_int_eq(bali_gzip_rewind(gzip, NULL), BAL_OK);
    ck_assert_int_eq(read_all(gzip, pieces[_i], again, &n_again, NULL), BAL_OK);
    ck_assert_uint_eq(n, n_again);
    ck_assert(memcmp(text, again, n) == 0);
    /* From the middle too. */
    ck_assert_int_eq(bali_gzip_rewind(gzip, NULL), BAL_OK);
    ck_assert_int_eq(bali_gzip_read(gzip, again, 5, &n_again, NULL), BAL_OK);
    ck_assert_int_eq(bali_gzip_rewind(gzip, NULL), BAL_OK);
    ck_assert_int_eq(read_all(gzip, pieces[_i], again, &n_again, NULL), BAL_OK);
    ck_assert_uint_eq(n, n_again);
    bali_gzip_free(gzip);
    bali_input_close(input);
}
END_TEST

START_TEST(a_pipe_cannot_be_read_again) {
    int ends[2];
    ck_assert_int_eq(pipe(ends), 0);
    char path[32];
    (void)snprintf(path, sizeof path, "/dev/fd/%d", ends[0]);
    bali_input *input = NULL;
    bali_gzip *gzip = NULL;
    bal_error err = {0};
    ck_assert_int_eq(bali_input_open(path, &input, NULL), BAL_OK);
    ck_assert_int_eq(bali_gzip_create(input, (bali_gzip_watch){0}, &gzip, NULL), BAL_OK);
    ck_assert_int_eq(bali_gzip_rewind(gzip, &err), BAL_ERR_IO);
    ck_assert_str_eq(err.code, "cannot-reread");
    bali_gzip_free(gzip);
    bali_input_close(input);
    close(ends[0]);
    close(ends[1]);
}
END_TEST

static bal_status read_packed_file(void *context, bal_error *err) {
    const packed_file *file = context;
    char text[ROOM];
    size_t n;
    return read_bytes(file->bytes, file->n, 4096, text, &n, err);
}

START_TEST(memory_may_run_out) {
    packed_file file = {.n = 0};
    add_text(&file, "smoker,age\nno,old\n");
    ck_assert_uint_ge(survive_allocations(read_packed_file, &file), 5);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("gzip");
    TCase *c = tcase_create("gzip");
    const int n = (int)(sizeof pieces / sizeof pieces[0]);
    tcase_add_loop_test(c, members_come_out_one_after_another, 0, n);
    tcase_add_loop_test(c, other_bytes_come_through, 0, n);
    tcase_add_loop_test(c, what_is_cut_short_is_refused, 0, n);
    tcase_add_loop_test(c, damage_is_refused, 0, n);
    tcase_add_test(c, a_bomb_is_refused_soon);
    tcase_add_test(c, ten_megabytes_are_free);
    tcase_add_loop_test(c, the_medium_is_seen_as_it_is_and_read_again, 0, n);
    tcase_add_test(c, a_pipe_cannot_be_read_again);
    tcase_add_test(c, memory_may_run_out);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
