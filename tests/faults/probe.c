/*
 * A small program on the files and threads of the library's lowest floor, for the fault sweeps: what a command does to its files,
 * without the rest of a command.
 *
 *   probe INPUT OUTPUT [COPIES]
 *
 * writes COPIES times the bytes of INPUT to OUTPUT, every copy with a sum that was computed on several threads.
 */
#include "base/files.h"
#include "base/memory.h"
#include "base/output.h"
#include "base/text.h"
#include "base/threads.h"

#include <signal.h>
#include <stdio.h>
#include <stdlib.h>

enum { TASKS = 16, MOST = 1 << 20 };

static void end_by_signal(int number) {
    bali_output_interrupted();
    (void)signal(number, SIG_DFL);
    (void)raise(number);
}

typedef struct checksums {
    const char *bytes;
    size_t length;
    unsigned long of[TASKS];
} checksums;

static bal_status add_up(void *context, size_t task, bal_error *err) {
    checksums *sums = context;
    unsigned char *copy = bali_allocate(sums->length, 1);
    if (!copy) return bali_out_of_memory(err);
    for (size_t i = task; i < sums->length; i += TASKS) {
        copy[i] = (unsigned char)sums->bytes[i];
        sums->of[task] += copy[i];
    }
    bali_free(copy);
    return BAL_OK;
}

static bal_status write_copies(const checksums *sums, bali_output *output, int copies, bal_error *err) {
    bali_text text = {0};
    for (size_t t = 0; t < TASKS; t++) bali_text_printf(&text, "%lu ", sums->of[t]);
    bali_text_putc(&text, '\n');
    bal_status status = text.failed ? bali_out_of_memory(err) : BAL_OK;
    for (int i = 0; i < copies && status == BAL_OK; i++) {
        status = bali_output_write(output, sums->bytes, sums->length, err);
        if (status == BAL_OK) status = bali_output_write(output, text.bytes, text.length, err);
    }
    bali_text_free(&text);
    return status;
}

static bal_status probe(const char *from, const char *to, int copies, bal_error *err) {
    char *bytes = NULL;
    checksums sums = {0};
    bali_output *output = NULL;
    bal_status status = bali_read_whole(from, MOST, &bytes, &sums.length, err);
    sums.bytes = bytes;
    if (status == BAL_OK) status = bali_output_open(to, &output, err);
    if (status == BAL_OK) status = bali_run_tasks(add_up, &sums, TASKS, 4, NULL, err);
    if (status == BAL_OK) status = write_copies(&sums, output, copies, err);
    if (status == BAL_OK) status = bali_output_commit(output, err);
    else bali_output_abandon(output);
    bali_free(bytes);
    return status;
}

int main(int argc, char **argv) {
    if (argc < 3) return 2;
    (void)signal(SIGINT, end_by_signal);
    (void)signal(SIGTERM, end_by_signal);
    (void)signal(SIGHUP, end_by_signal);
    (void)signal(SIGXFSZ, SIG_IGN);
    bal_error err = {0};
    if (probe(argv[1], argv[2], argc > 3 ? atoi(argv[3]) : 1, &err) == BAL_OK) return 0;
    char text[2048];
    bal_error_text(&err, text, sizeof text);
    (void)fprintf(stderr, "%s\n", text);
    return 3;
}
