/* Answers lines "function arguments" on standard input with numbers on standard output, for test_mathematics.py. */
#include "base/beta.h"
#include "base/mathematics.h"

#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static bool answer_log_pochhammer(const double *x) {
    return printf("%.17g\n", bali_log_pochhammer(x[0], x[1])) > 0;
}

static bool answer_beta_cdf(const double *x) {
    double lower, upper;
    if (!bali_beta_cdf(x[0], x[1], x[2], &lower, &upper)) return puts("refused") >= 0;
    return printf("%.17g %.17g\n", lower, upper) > 0;
}

static bool answer_beta_quantile(const double *x) {
    double quantile;
    if (!bali_beta_quantile(x[0], x[1], x[2], &quantile)) return puts("refused") >= 0;
    return printf("%.17g\n", quantile) > 0;
}

static const struct {
    const char *name;
    int arguments;
    bool (*answer)(const double *x);
} functions[] = {
    {"log_pochhammer", 2, answer_log_pochhammer},
    {"beta_cdf", 3, answer_beta_cdf},
    {"beta_quantile", 3, answer_beta_quantile},
};

static bool answer_line(char *line) {
    double x[3] = {0};
    char *rest = line + strcspn(line, " ");
    if (*rest != '\0') *rest++ = '\0';
    for (size_t f = 0; f < sizeof functions / sizeof *functions; f++) {
        if (strcmp(functions[f].name, line) != 0) continue;
        for (int i = 0; i < functions[f].arguments; i++) {
            char *start = rest;
            x[i] = strtod(start, &rest);
            if (rest == start) return false;
        }
        return strspn(rest, " \n") == strlen(rest) && functions[f].answer(x);
    }
    return false;
}

int main(void) {
    char line[256];
    bali_mathematics_init();
    while (fgets(line, sizeof line, stdin)) {
        if (answer_line(line)) continue;
        (void)fprintf(stderr, "not understood: %s\n", line);
        return EXIT_FAILURE;
    }
    return fflush(stdout) == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
