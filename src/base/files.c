#include "base/files.h"

#include "base/memory.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

static const char standard_input[] = "standard input";

struct bali_input {
    char *path;          /* as the user gave it */
    int descriptor;      /* not closed when it is standard input */
    bool regular;
    off_t start;         /* where a regular file stood when it was opened: standard input may be in its middle */
    struct stat opened;  /* to see whether the file changes under our hands */
    uint64_t position;
};

bal_status bali_system_error(bal_error *err, const char *code, const char *file, int reason, const char *what, const char *mend) {
    char text[128];
    if (!err || err->status != BAL_OK) return bal_error_set(err, BAL_ERR_IO, code, "%s", what);
    if (strerror_r(reason, text, sizeof text) != 0) (void)snprintf(text, sizeof text, "error %d", reason);
    (void)bal_error_set(err, BAL_ERR_IO, code, "%s: %s; %s", what, text, mend);
    bal_error_place(err, file, 0, 0);
    return BAL_ERR_IO;
}

static bal_status cannot_open(const bali_input *input, int reason, bal_error *err) {
    return bali_system_error(err, "cannot-open", bali_input_name(input), reason, "cannot be opened",
                             "check the name and the permission to read it");
}

static bal_status cannot_read(const bali_input *input, int reason, bal_error *err) {
    return bali_system_error(err, "cannot-read", bali_input_name(input), reason, "cannot be read",
                             "try again, or copy it to another disk");
}

static int open_to_read(const char *path) {
    if (strcmp(path, "-") == 0) return STDIN_FILENO;
    int descriptor;
    do descriptor = open(path, O_RDONLY | O_CLOEXEC | O_NOCTTY);
    while (descriptor < 0 && errno == EINTR);
    return descriptor;
}

bal_status bali_input_open(const char *path, bali_input **out, bal_error *err) {
    *out = NULL;
    bali_input *input = bali_allocate(1, sizeof *input);
    if (!input) return bali_out_of_memory(err);
    bal_status status = BAL_OK;
    input->descriptor = -1;
    input->path = bali_duplicate(path, strlen(path));
    if (!input->path) {
        status = bali_out_of_memory(err);
        goto done;
    }
    input->descriptor = open_to_read(path);
    if (input->descriptor < 0 || fstat(input->descriptor, &input->opened) != 0) {
        status = cannot_open(input, errno, err);
        goto done;
    }
    if (S_ISDIR(input->opened.st_mode)) {
        status = cannot_open(input, EISDIR, err);
        goto done;
    }
    if (S_ISREG(input->opened.st_mode)) {
        input->start = lseek(input->descriptor, 0, SEEK_CUR);
        input->regular = input->start >= 0;
    }
    *out = input;
    input = NULL;
done:
    bali_input_close(input);
    return status;
}

/* Whoever writes to a file while it is read hands over half of the old and half of the new: no number may come of that. */
static bal_status check_unchanged(const bali_input *input, bal_error *err) {
    if (!input->regular) return BAL_OK;
    struct stat now;
    if (fstat(input->descriptor, &now) != 0) return cannot_read(input, errno, err);
    const struct stat *then = &input->opened;
    if (now.st_size == then->st_size && now.st_mtim.tv_sec == then->st_mtim.tv_sec && now.st_mtim.tv_nsec == then->st_mtim.tv_nsec)
        return BAL_OK;
    bal_status status = bal_error_set(err, BAL_ERR_DATA, "changed-while-read",
                                      "changed while it was being read; wait until it is written, then start again");
    bal_error_place(err, bali_input_name(input), 0, 0);
    return status;
}

bal_status bali_input_read(bali_input *input, void *bytes, size_t size, size_t *length, bal_error *err) {
    *length = 0;
    while (*length < size) {
        ssize_t got = read(input->descriptor, (char *)bytes + *length, size - *length);
        if (got < 0 && errno == EINTR) continue;
        if (got < 0) return cannot_read(input, errno, err);
        if (got == 0) return check_unchanged(input, err);
        *length += (size_t)got;
        input->position += (uint64_t)got;
    }
    return BAL_OK;
}

bool bali_input_can_rewind(const bali_input *input) {
    return input->regular;
}

bal_status bali_input_rewind(bali_input *input, bal_error *err) {
    return bali_input_seek(input, 0, err);
}

bal_status bali_input_seek(bali_input *input, uint64_t position, bal_error *err) {
    if (!input->regular) {
        bal_status status = bal_error_set(err, BAL_ERR_IO, "cannot-reread",
                                          "has to be read more than once, and a pipe can be read only once; save it to a file first");
        bal_error_place(err, bali_input_name(input), 0, 0);
        return status;
    }
    if (lseek(input->descriptor, input->start + (off_t)position, SEEK_SET) < 0)
        return bali_system_error(err, "cannot-reread", bali_input_name(input), errno, "cannot be read again",
                                 "save it to a file first");
    input->position = position;
    return BAL_OK;
}

const char *bali_input_name(const bali_input *input) {
    return strcmp(input->path, "-") == 0 ? standard_input : input->path;
}

const char *bali_input_base_name(const bali_input *input) {
    return bali_base_name(input->path);
}

uint64_t bali_input_size(const bali_input *input) {
    return input->regular && input->opened.st_size > 0 ? (uint64_t)input->opened.st_size : 0;
}

uint64_t bali_input_position(const bali_input *input) {
    return input->position;
}

void bali_input_close(bali_input *input) {
    if (!input) return;
    if (input->descriptor >= 0 && strcmp(input->path, "-") != 0) (void)close(input->descriptor);
    bali_free(input->path);
    bali_free(input);
}

/* How much to make room for at first: a regular file's size, so that it need not grow. */
static size_t first_room(const bali_input *input, size_t limit) {
    enum { MODEST = 1 << 16 };
    size_t room = MODEST;
    if (input->regular && input->opened.st_size > 0 && (uintmax_t)input->opened.st_size < SIZE_MAX)
        room = (size_t)input->opened.st_size;
    return room < limit ? room : limit;
}

static bal_status too_large(const bali_input *input, size_t limit, bal_error *err) {
    bal_status status =
        bal_error_set(err, BAL_ERR_DATA, "file-too-large",
                      "is larger than %zu bytes, the most that is read of such a file; check that it is the right one", limit);
    bal_error_place(err, bali_input_name(input), 0, 0);
    return status;
}

/* Reads to the end or the limit, doubling the room; one byte more than the limit is looked for in a byte of its own. */
static bal_status read_all(bali_input *input, size_t limit, bali_goes_on goes_on, char **bytes, size_t *length, bal_error *err) {
    size_t room = first_room(input, limit);
    *bytes = bali_allocate(room + 1, 1);
    if (!*bytes) return bali_out_of_memory(err);
    for (;;) {
        size_t got;
        bal_status status = bali_input_read(input, *bytes + *length, room - *length, &got, err);
        if (status != BAL_OK) return status;
        *length += got;
        char beyond;
        if (*length < room) return BAL_OK;
        status = bali_input_read(input, &beyond, 1, &got, err);
        if (status != BAL_OK || got == 0 || (goes_on && !goes_on(*bytes, *length))) return status;
        if (room == limit) return too_large(input, limit, err);
        size_t more = room <= limit / 2 ? room * 2 : limit;
        char *moved = bali_reallocate(*bytes, more + 1, 1);
        if (!moved) return bali_out_of_memory(err);
        *bytes = moved;
        room = more;
        (*bytes)[(*length)++] = beyond;
    }
}

bal_status bali_read_whole(const char *path, size_t limit, char **bytes, size_t *length, bal_error *err) {
    return bali_read_while(path, limit, NULL, bytes, length, err);
}

bal_status bali_read_while(const char *path, size_t limit, bali_goes_on goes_on, char **bytes, size_t *length, bal_error *err) {
    *bytes = NULL;
    *length = 0;
    if (limit == SIZE_MAX) limit--;
    bali_input *input = NULL;
    char *all = NULL;
    size_t n = 0;
    bal_status status = bali_input_open(path, &input, err);
    if (status == BAL_OK && input->regular && (uintmax_t)input->opened.st_size > limit) status = too_large(input, limit, err);
    if (status == BAL_OK) status = read_all(input, limit, goes_on, &all, &n, err);
    if (status == BAL_OK) {
        all[n] = '\0';
        *bytes = all;
        *length = n;
        all = NULL;
    }
    bali_free(all);
    bali_input_close(input);
    return status;
}

static bool same_time(const struct timespec *a, const struct timespec *b) {
    return a->tv_sec == b->tv_sec && a->tv_nsec == b->tv_nsec;
}

bool bali_input_same(const bali_input *a, const bali_input *b) {
    const struct stat *x = &a->opened, *y = &b->opened;
    return a->regular && b->regular && x->st_dev == y->st_dev && x->st_ino == y->st_ino && x->st_size == y->st_size &&
           same_time(&x->st_mtim, &y->st_mtim) && same_time(&x->st_ctim, &y->st_ctim);
}

const char *bali_base_name(const char *path) {
    if (strcmp(path, "-") == 0) return standard_input;
    const char *slash = strrchr(path, '/');
    return slash ? slash + 1 : path;
}

bool bali_same_file(const char *a, const char *b) {
    struct stat of_a, of_b;
    return stat(a, &of_a) == 0 && stat(b, &of_b) == 0 && of_a.st_dev == of_b.st_dev && of_a.st_ino == of_b.st_ino;
}
