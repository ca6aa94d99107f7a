/* The table of commands, and what has to be in order before any of them runs. */
#include "cli/commands.h"
#include "cli/console.h"

#include "base/mathematics.h"
#include "base/memory.h"
#include "base/names.h"
#include "base/output.h"
#include "ballast.h"

#include <fcntl.h>
#include <signal.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

static const bali_command *const commands[] = {&bali_cmd_check, &bali_cmd_fit, &bali_cmd_tally, &bali_cmd_draw, &bali_cmd_explain};
enum { N_COMMANDS = sizeof commands / sizeof commands[0] };

/* A file must never be opened as descriptor 0, 1 or 2, or messages would end up in it. */
static bool open_standard_descriptors(void) {
    for (int fd = 0; fd <= 2; fd++) {
        if (fcntl(fd, F_GETFD) != -1) continue;
        /* Reading from what was closed, or writing to it, still fails: the wrong way round. */
        if (open("/dev/null", fd == 0 ? O_WRONLY : O_RDONLY) != fd) return false;
    }
    return true;
}

static void end_by_signal(int number) {
    bali_output_interrupted();
    (void)signal(number, SIG_DFL);
    (void)raise(number);
}

static void set_signals(void) {
    static const int ending[] = {SIGINT, SIGTERM, SIGHUP};
    for (size_t i = 0; i < sizeof ending / sizeof ending[0]; i++) {
        struct sigaction old, action = {.sa_handler = end_by_signal};
        (void)sigemptyset(&action.sa_mask);
        if (sigaction(ending[i], NULL, &old) == 0 && old.sa_handler != SIG_IGN) (void)sigaction(ending[i], &action, NULL);
    }
    (void)signal(SIGXFSZ, SIG_IGN); /* a limit on file sizes comes back as a failed write */
}

static void put_overview(bali_text *text) {
    bali_text_puts(text, "usage: ballast COMMAND [OPTIONS] ...\n\n"
                         "Learns the probability tables of a diagnostic network from a table of past\n"
                         "cases, with Dirichlet priors, and says what rests on the data and what on the\n"
                         "prior.\n\n");
    bali_text summary = {0};
    for (size_t i = 0; i < N_COMMANDS; i++) {
        bali_text_printf(text, "  %-9s%s\n%11s", commands[i]->name, commands[i]->usage, "");
        bali_text_clear(&summary);
        bali_text_add(&summary, commands[i]->summary, strcspn(commands[i]->summary, ".:;"));
        bali_text_put_wrapped(text, bali_text_string(&summary), 11, 11);
        text->failed |= summary.failed;
    }
    bali_text_free(&summary);
    bali_text_puts(text, "\nballast COMMAND --help tells more; ballast --version tells the version.\n"
                         "The numbers support the judgement of qualified people; they do not replace it.\n");
}

static const bali_command *find_command(const char *name) {
    for (size_t i = 0; i < N_COMMANDS; i++)
        if (strcmp(commands[i]->name, name) == 0) return commands[i];
    return NULL;
}

static int refuse_command(const char *name) {
    const char *names[N_COMMANDS + 3] = {"help", "--help", "--version"};
    size_t n = 3;
    bal_error err = {0};
    for (size_t i = 0; i < N_COMMANDS; i++) names[n++] = commands[i]->name;
    size_t near = bali_nearest(name, strlen(name), names, n);
    (void)bal_error_set(&err, BAL_ERR_ARGUMENT, "unknown-command", "there is no command \"%.80s\"; %s%s", name,
                        near == BALI_NO_NAME ? "ballast --help lists them" : "did you mean ", near == BALI_NO_NAME ? "" : names[near]);
    return bali_console_refuse(&err);
}

static int print_help(const bali_command *command) {
    bali_text text = {0};
    if (command) {
        bali_command_help(command, &text);
    } else {
        put_overview(&text);
    }
    bal_error err = {0};
    int exit = text.failed ? (bali_out_of_memory(&err), bali_console_refuse(&err)) : bali_console_print(text.bytes, text.length);
    bali_text_free(&text);
    return exit;
}

static int run_command(const bali_command *command, int n_words, char *const *words) {
    bali_call call;
    bal_error err = {0};
    int exit;
    if (bali_call_read(command, n_words, words, &call, &err) != BAL_OK) {
        exit = bali_console_refuse(&err);
    } else if (call.values[OPTION_HELP].given) {
        exit = print_help(command);
    } else {
        exit = command->run(&call);
    }
    bali_call_free(&call);
    return exit;
}

static int without_command(void) {
    bali_text text = {0};
    put_overview(&text);
    (void)fputs(bali_text_string(&text), stderr);
    bali_text_free(&text);
    return 2;
}

static int refuse_argument(const char *usage) {
    bal_error err = {0};
    (void)bal_error_set(&err, BAL_ERR_ARGUMENT, "wrong-arguments", "there is one argument too many; usage: ballast %s", usage);
    return bali_console_refuse(&err);
}

static int help(int argc, char **argv) {
    if (argc > 3) return refuse_argument("help [COMMAND]");
    if (argc == 2 || strcmp(argv[2], "help") == 0) return print_help(NULL);
    const bali_command *about = find_command(argv[2]);
    return about ? print_help(about) : refuse_command(argv[2]);
}

static int print_version(int argc) {
    static const char version[] = "ballast " BALLAST_VERSION "\n";
    return argc > 2 ? refuse_argument("--version") : bali_console_print(version, sizeof version - 1);
}

int main(int argc, char **argv) {
    if (!open_standard_descriptors()) return 3;
    set_signals();
    bali_mathematics_init();
    if (argc < 2) return without_command();
    const char *word = argv[1];
    if (strcmp(word, "--version") == 0) return print_version(argc);
    if (strcmp(word, "help") == 0 || strcmp(word, "--help") == 0 || strcmp(word, "-h") == 0) return help(argc, argv);
    const bali_command *command = find_command(word);
    return command ? run_command(command, argc - 2, argv + 2) : refuse_command(word);
}
