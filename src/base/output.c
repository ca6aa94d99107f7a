/* O_TMPFILE and O_PATH need it; nothing else in the project does. */
#define _GNU_SOURCE
#include "base/output.h"

#include "base/files.h"
#include "base/memory.h"

#include <errno.h>
#include <fcntl.h>
#include <limits.h>
#include <poll.h>
#include <signal.h>
#include <stdatomic.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum { BUFFER_BYTES = 1 << 16, MOST_LINKS = 40, MOST_NOTED = 16, HIDDEN_BYTES = 48, MOST_TRIES = 10000 };

/* Where the bytes go until the commit. */
typedef enum place {
    IN_PLACE, /* standard output, a FIFO, a device: nothing to rename */
    UNNAMED,  /* a file without a name in the target's folder: gone by itself when the program is killed */
    NAMED     /* a hidden file beside the target, where the file system knows no unnamed ones */
} place;

struct bali_output {
    char *name;                /* as the user gave it */
    char *path;                /* where its links lead */
    const char *target;        /* the last part of path */
    char *buffer;
    size_t filled;
    int descriptor, folder;
    place place;
    bool folder_syncs;         /* the folder could be opened in a way that allows it */
    bool replaces;             /* a regular file stood there at the opening: old */
    bool failed;
    struct stat old;
    char hidden[HIDDEN_BYTES]; /* the hidden name that stands in the folder now; "" when there is none */
};

/* ---- hidden names ---- */

/*
 * The hidden names that stand in a folder at this moment, for a signal handler to remove. The library's only variable that
 * outlives a call: a handler has nothing else to go by. A place is FREE, TAKEN while it is filled in, then NOTED. When all are
 * taken, a name is not noted, and an interrupted program may leave that hidden file behind.
 */
enum { FREE, TAKEN, NOTED };
static struct {
    atomic_int state;
    int folder;
    char name[HIDDEN_BYTES];
} noted[MOST_NOTED];

static void note_hidden(const bali_output *output) {
    for (size_t i = 0; i < MOST_NOTED; i++) {
        int expected = FREE;
        if (!atomic_compare_exchange_strong(&noted[i].state, &expected, TAKEN)) continue;
        noted[i].folder = output->folder;
        memcpy(noted[i].name, output->hidden, HIDDEN_BYTES);
        atomic_store(&noted[i].state, NOTED);
        return;
    }
}

static void forget_hidden(bali_output *output) {
    for (size_t i = 0; i < MOST_NOTED; i++)
        if (atomic_load(&noted[i].state) == NOTED && noted[i].folder == output->folder && strcmp(noted[i].name, output->hidden) == 0)
            atomic_store(&noted[i].state, FREE);
    output->hidden[0] = '\0';
}

void bali_output_interrupted(void) {
    int before = errno;
    for (size_t i = 0; i < MOST_NOTED; i++)
        if (atomic_load(&noted[i].state) == NOTED) (void)unlinkat(noted[i].folder, noted[i].name, 0);
    errno = before;
}

/* Holds back the signals that end the program while a hidden name stands in the folder and is not noted. */
static void hold_signals(sigset_t *before) {
    sigset_t held;
    (void)sigemptyset(&held);
    (void)sigaddset(&held, SIGINT);
    (void)sigaddset(&held, SIGTERM);
    (void)sigaddset(&held, SIGHUP);
    (void)pthread_sigmask(SIG_BLOCK, &held, before);
}

static void release_signals(const sigset_t *before) {
    (void)pthread_sigmask(SIG_SETMASK, before, NULL);
}

/* Finds a hidden name that is not in use and has it made; signals are held. Returns 0 or an errno. */
static int make_hidden(bali_output *output, int (*make)(bali_output *output)) {
    int reason = EEXIST;
    for (unsigned n = 0; n < MOST_TRIES && reason == EEXIST; n++) {
        (void)snprintf(output->hidden, sizeof output->hidden, ".ballast-%ld-%u", (long)getpid(), n);
        reason = make(output);
    }
    if (reason == 0) note_hidden(output);
    else output->hidden[0] = '\0';
    return reason;
}

/* ---- system calls that may be interrupted; each returns 0 or an errno ---- */

static int open_in(int folder, const char *path, int flags, mode_t mode, int *descriptor) {
    do *descriptor = openat(folder, path, flags | O_CLOEXEC | O_NOCTTY, mode);
    while (*descriptor < 0 && errno == EINTR);
    return *descriptor < 0 ? errno : 0;
}

/* Some outputs say only here that they could not write. After EINTR the descriptor is closed all the same (Linux). */
static int close_checked(int *descriptor) {
    int closing = *descriptor;
    *descriptor = -1;
    return close(closing) == 0 || errno == EINTR ? 0 : errno;
}

static int sync_to_disk(int descriptor) {
    int result;
    do result = fsync(descriptor);
    while (result != 0 && errno == EINTR);
    return result == 0 ? 0 : errno;
}

static int write_all(int descriptor, const char *bytes, size_t length) {
    while (length > 0) {
        ssize_t written = write(descriptor, bytes, length);
        if (written > 0) {
            bytes += written;
            length -= (size_t)written;
        } else if (written == 0) {
            return EIO;
        } else if (errno == EAGAIN) { /* somebody made our standard output non-blocking */
            struct pollfd wait = {.fd = descriptor, .events = POLLOUT};
            if (poll(&wait, 1, -1) < 0 && errno != EINTR) return errno;
        } else if (errno != EINTR) {
            return errno;
        }
    }
    return 0;
}

/* Gives the unnamed file a name in its folder. */
static int link_as(const bali_output *output, const char *name) {
    char by_descriptor[32];
    (void)snprintf(by_descriptor, sizeof by_descriptor, "/proc/self/fd/%d", output->descriptor);
    int result;
    do result = linkat(AT_FDCWD, by_descriptor, output->folder, name, AT_SYMLINK_FOLLOW);
    while (result != 0 && errno == EINTR);
    return result == 0 ? 0 : errno;
}

static int link_hidden(bali_output *output) {
    return link_as(output, output->hidden);
}

static int rename_to_target(const bali_output *output) {
    int result;
    do result = renameat(output->folder, output->hidden, output->folder, output->target);
    while (result != 0 && errno == EINTR);
    return result == 0 ? 0 : errno;
}

static int change_mode(int descriptor, mode_t mode) {
    int result;
    do result = fchmod(descriptor, mode);
    while (result != 0 && errno == EINTR);
    return result == 0 ? 0 : errno;
}

/* ---- opening; each returns 0 or an errno ---- */

bool bali_output_is_standard(const char *name) {
    return strcmp(name, "-") == 0 || strcmp(name, "/dev/stdout") == 0 || strcmp(name, "/dev/fd/1") == 0 ||
           strcmp(name, "/proc/self/fd/1") == 0;
}

/* A descriptor of its own, so that closing it tells whether the last bytes arrived. */
static int open_standard_output(bali_output *output) {
    output->descriptor = fcntl(STDOUT_FILENO, F_DUPFD_CLOEXEC, STDERR_FILENO + 1);
    return output->descriptor < 0 ? errno : 0;
}

static int open_in_place(bali_output *output) {
    struct stat now;
    int reason = open_in(AT_FDCWD, output->path, O_WRONLY, 0, &output->descriptor);
    if (reason) return reason;
    if (fstat(output->descriptor, &now) != 0) return errno;
    return S_ISREG(now.st_mode) ? EEXIST : 0; /* it became a file since we looked, and is not ours to tear */
}

/* Puts where a link leads in place of its path. */
static int follow_link(char **path) {
    char leads_to[PATH_MAX];
    ssize_t length = readlink(*path, leads_to, sizeof leads_to);
    if (length < 0) return errno;
    if (length == 0 || (size_t)length == sizeof leads_to) return length ? ENAMETOOLONG : ENOENT;
    const char *slash = strrchr(*path, '/');
    size_t before = leads_to[0] == '/' || !slash ? 0 : (size_t)(slash - *path) + 1;
    char *joined = bali_allocate(before + (size_t)length + 1, 1);
    if (!joined) return ENOMEM;
    memcpy(joined, *path, before);
    memcpy(joined + before, leads_to, (size_t)length);
    bali_free(*path);
    *path = joined;
    return 0;
}

/* Follows links to what is to be replaced or made. The last one may dangle, which realpath() would not have. */
static int follow_links(char **path) {
    for (int links = 0; links < MOST_LINKS; links++) {
        struct stat now;
        if (lstat(*path, &now) != 0) return errno == ENOENT ? 0 : errno;
        if (!S_ISLNK(now.st_mode)) return 0;
        int reason = follow_link(path);
        if (reason) return reason;
    }
    return ELOOP;
}

/* Opens the folder that the path lies in; one that may be written but not read will do. */
static int open_folder(bali_output *output) {
    char *slash = strrchr(output->path, '/');
    output->target = slash ? slash + 1 : output->path;
    if (output->target[0] == '\0') return output->path[0] ? EISDIR : ENOENT;
    char *folder = slash ? bali_duplicate(output->path, (size_t)(slash - output->path) + 1) : bali_duplicate(".", 1);
    if (!folder) return ENOMEM;
    int reason = open_in(AT_FDCWD, folder, O_RDONLY | O_DIRECTORY, 0, &output->folder);
    output->folder_syncs = reason == 0;
    if (reason == EACCES) reason = open_in(AT_FDCWD, folder, O_PATH | O_DIRECTORY, 0, &output->folder);
    bali_free(folder);
    return reason;
}

/* Looks at what will be replaced. A file that is protected against writing stays, although its folder would let us. */
static int look_at_old(bali_output *output) {
    if (fstatat(output->folder, output->target, &output->old, AT_SYMLINK_NOFOLLOW) != 0) return errno == ENOENT ? 0 : errno;
    if (S_ISDIR(output->old.st_mode)) return EISDIR;
    output->replaces = true;
    bool protected = faccessat(output->folder, output->target, W_OK, AT_EACCESS) != 0 && errno != ENOENT;
    return protected ? errno : 0;
}

/* What replaces a file starts out closed to everybody else: the old one's mode is not known to be wider. */
static int create_hidden(bali_output *output) {
    return open_in(output->folder, output->hidden, O_WRONLY | O_CREAT | O_EXCL, output->replaces ? 0600 : 0666, &output->descriptor);
}

static int open_beside(bali_output *output) {
    output->place = UNNAMED;
    int reason = EOPNOTSUPP;
    /* An unnamed file gets its name by way of /proc, which a narrow container may lack. */
    if (access("/proc/self/fd", X_OK) == 0) reason = open_in(output->folder, ".", O_TMPFILE | O_WRONLY, 0666, &output->descriptor);
    /* Kernels and file systems without unnamed files answer in one of these ways. */
    if (reason != EOPNOTSUPP && reason != EISDIR && reason != ENOENT) return reason;
    output->place = NAMED;
    sigset_t before;
    hold_signals(&before);
    reason = make_hidden(output, create_hidden);
    release_signals(&before);
    return reason;
}

static int open_target(bali_output *output) {
    if (bali_output_is_standard(output->name)) return open_standard_output(output);
    struct stat now;
    if (stat(output->path, &now) == 0) {
        if (S_ISDIR(now.st_mode)) return EISDIR;
        if (!S_ISREG(now.st_mode)) return open_in_place(output);
    } else if (errno != ENOENT) {
        return errno;
    }
    int reason = follow_links(&output->path);
    if (reason == 0) reason = open_folder(output);
    if (reason == 0) reason = look_at_old(output);
    if (reason == 0) reason = open_beside(output);
    return reason;
}

static bal_status cannot_write(bali_output *output, int reason, bal_error *err) {
    output->failed = true;
    if (reason == ENOMEM) return bali_out_of_memory(err);
    const char *name = strcmp(output->name, "-") == 0 ? "standard output" : output->name;
    return bali_system_error(err, "cannot-write", name, reason, "cannot be written", "see to the folder, its permissions and its room, or choose another place");
}

bal_status bali_output_open(const char *path, bali_output **out, bal_error *err) {
    *out = NULL;
    bali_output *output = bali_allocate(1, sizeof *output);
    if (!output) return bali_out_of_memory(err);
    bal_status status = BAL_OK;
    output->descriptor = output->folder = -1;
    output->name = bali_duplicate(path, strlen(path));
    output->path = bali_duplicate(path, strlen(path));
    output->buffer = bali_allocate(BUFFER_BYTES, 1);
    if (!output->name || !output->path || !output->buffer) {
        status = bali_out_of_memory(err);
    } else {
        int reason = open_target(output);
        if (reason) status = cannot_write(output, reason, err);
    }
    if (status == BAL_OK) *out = output;
    else bali_output_abandon(output);
    return status;
}

bool bali_output_same(const bali_output *a, const bali_output *b) {
    struct stat of_a, of_b;
    if (a->place == IN_PLACE || b->place == IN_PLACE || strcmp(a->target, b->target) != 0) return false;
    return fstat(a->folder, &of_a) == 0 && fstat(b->folder, &of_b) == 0 && of_a.st_dev == of_b.st_dev && of_a.st_ino == of_b.st_ino;
}

/* ---- writing and committing ---- */

static int flush(bali_output *output) {
    size_t length = output->filled;
    output->filled = 0;
    return write_all(output->descriptor, output->buffer, length);
}

bal_status bali_output_write(bali_output *output, const void *bytes, size_t length, bal_error *err) {
    int reason = output->failed ? EIO : 0;
    if (reason == 0 && length > BUFFER_BYTES - output->filled) reason = flush(output);
    if (reason == 0 && length > BUFFER_BYTES) {
        reason = write_all(output->descriptor, bytes, length);
    } else if (reason == 0 && length > 0) {
        memcpy(output->buffer + output->filled, bytes, length);
        output->filled += length;
    }
    return reason ? cannot_write(output, reason, err) : BAL_OK;
}

/* Gives the new file the old one's owner, group and mode, as far as we may. Where the group cannot be kept, ours gets no more
 * than everybody has. Returns 0 or an errno. */
static int take_over_mode(const bali_output *output) {
    struct stat made;
    if (fstat(output->descriptor, &made) != 0) return errno;
    mode_t mode = output->old.st_mode & 07777;
    bool owner_differs = made.st_uid != output->old.st_uid, group_differs = made.st_gid != output->old.st_gid;
    if (group_differs && fchown(output->descriptor, (uid_t)-1, output->old.st_gid) != 0)
        mode = (mode & ~(mode_t)(S_ISGID | S_IRWXG)) | (mode & S_IRWXO) << 3;
    if (owner_differs && fchown(output->descriptor, output->old.st_uid, (gid_t)-1) != 0) mode &= ~(mode_t)S_ISUID;
    bool as_it_was = !owner_differs && !group_differs && (made.st_mode & 07777) == mode;
    return as_it_was ? 0 : change_mode(output->descriptor, mode);
}

/* Gives the finished file its name; signals are held. Returns 0 or an errno. */
static int put_in_place(bali_output *output) {
    int reason = 0;
    if (output->place == UNNAMED && !output->replaces) {
        reason = link_as(output, output->target);
        if (reason == 0) return close_checked(&output->descriptor);
        if (reason != EEXIST) return reason; /* else somebody was quicker: replace theirs */
    }
    if (output->place == UNNAMED) reason = make_hidden(output, link_hidden);
    if (reason == 0) reason = close_checked(&output->descriptor);
    if (reason == 0) reason = rename_to_target(output);
    if (reason == 0) forget_hidden(output);
    return reason;
}

/* Makes the new name last. Some file systems cannot sync a folder and say so; a disk that fails is another matter. */
static int sync_folder(const bali_output *output) {
    if (!output->folder_syncs) return 0;
    int reason = sync_to_disk(output->folder);
    return reason == EINVAL || reason == EROFS || reason == EOPNOTSUPP || reason == ENOSYS ? 0 : reason;
}

static int commit_file(bali_output *output) {
    int reason = output->replaces ? take_over_mode(output) : 0;
    if (reason == 0) reason = sync_to_disk(output->descriptor);
    if (reason) return reason;
    sigset_t before;
    hold_signals(&before);
    reason = put_in_place(output);
    release_signals(&before);
    return reason ? reason : sync_folder(output);
}

bal_status bali_output_commit(bali_output *output, bal_error *err) {
    int reason = output->failed ? EIO : flush(output);
    if (reason == 0) reason = output->place == IN_PLACE ? close_checked(&output->descriptor) : commit_file(output);
    bal_status status = reason ? cannot_write(output, reason, err) : BAL_OK;
    bali_output_abandon(output);
    return status;
}

void bali_output_abandon(bali_output *output) {
    if (!output) return;
    if (output->descriptor >= 0) (void)close(output->descriptor);
    if (output->hidden[0]) {
        (void)unlinkat(output->folder, output->hidden, 0);
        forget_hidden(output);
    }
    if (output->folder >= 0) (void)close(output->folder);
    bali_free(output->buffer);
    bali_free(output->path);
    bali_free(output->name);
    bali_free(output);
}

bal_status bali_output_write_whole(const char *path, const void *bytes, size_t length, bal_error *err) {
    bali_output *output = NULL;
    bal_status status = bali_output_open(path, &output, err);
    if (status != BAL_OK) return status;
    status = bali_output_write(output, bytes, length, err);
    if (status == BAL_OK) return bali_output_commit(output, err);
    bali_output_abandon(output);
    return status;
}
