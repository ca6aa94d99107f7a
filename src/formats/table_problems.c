#include "formats/table_problems.h"

#include "base/memory.h"
#include "formats/phrase.h"
#include "formats/table_messages.h"

#include <string.h>

bool bali_problems_create(bali_problems *problems, const bal_domain *domain, const bal_notices *notices) {
    *problems = (bali_problems){.domain = domain};
    if (notices) problems->notices = *notices;
    problems->untold = bali_allocate(bal_domain_variables(domain), sizeof *problems->untold);
    return problems->untold != NULL;
}

void bali_problems_free(bali_problems *problems) {
    bali_free(problems->untold);
    problems->untold = NULL;
}

bool bali_problems_count(bali_problems *problems, bali_problem_kind kind, size_t variable) {
    if (++problems->counts[kind] <= BALI_MOST_TOLD) return true;
    if (kind == BALI_BAD_LABEL && !problems->untold[variable]) {
        problems->untold[variable] = true;
        problems->n_untold++;
    }
    return false;
}

static bool is_missing(const bal_error *problem) {
    return strcmp(problem->code, "missing-cells") == 0;
}

void bali_problems_tell(bali_problems *problems, const bal_error *problem) {
    if (problems->first.status == BAL_OK) problems->first = *problem;
    if (problems->first_missing.status == BAL_OK && is_missing(problem)) problems->first_missing = *problem;
    if (problems->notices.tell) problems->notices.tell(problems->notices.context, BAL_PROBLEM, problem);
}

static void tell_rest(bali_problems *problems, bali_problem_kind kind, const char *code, const char *what) {
    if (problems->counts[kind] <= BALI_MOST_TOLD) return;
    bali_phrase phrase = {0};
    bali_phrase_add(&phrase, "and ");
    bali_phrase_count(&phrase, problems->counts[kind] - BALI_MOST_TOLD);
    bali_phrase_add(&phrase, " more %s", what);
    if (kind == BALI_BAD_LABEL)
        bali_phrase_add(&phrase, " in %zu column%s", problems->n_untold, problems->n_untold == 1 ? "" : "s");
    bal_error rest = {0};
    (void)bal_error_set(&rest, BAL_ERR_DATA, code, "%s", phrase.text);
    bal_error_place(&rest, problems->first.file, 0, 0);
    bali_problems_tell(problems, &rest);
}

/* All missing cells in one message, placed at the first. */
static void sum_missing(const bali_problems *problems, const bali_missing_cells *missing, bal_error *sum) {
    uint64_t cells = problems->counts[BALI_MISSING_CELL];
    bali_phrase phrase = {0};
    bali_phrase_count(&phrase, cells);
    bali_phrase_add(&phrase, " missing cell%s: ", cells == 1 ? "" : "s");
    bali_say_largest(problems->domain, missing->counts, &phrase);
    bali_phrase_add(&phrase, "; the first is here; fill in what is missing, or see --missing: drop would leave out ");
    bali_phrase_count(&phrase, missing->incomplete);
    bali_phrase_add(&phrase, " of ");
    bali_phrase_count(&phrase, missing->records);
    bali_phrase_add(&phrase, " records");
    *sum = (bal_error){0};
    (void)bal_error_set(sum, BAL_ERR_DATA, "missing-cells", "%s", phrase.text);
    bal_error_place(sum, problems->first_missing.file, problems->first_missing.line, problems->first_missing.column);
    bal_error_context(sum, problems->first_missing.record, problems->first_missing.variable);
}

void bali_problems_conclude(bali_problems *problems, const bali_missing_cells *missing, bal_error *failure) {
    if (problems->first.status == BAL_OK) return;
    bool missing_first = is_missing(&problems->first);
    tell_rest(problems, BALI_BAD_LABEL, "unknown-label", "unknown labels");
    tell_rest(problems, BALI_BAD_NUMBER, "bad-number-cell", "cells that are no numbers");
    tell_rest(problems, BALI_BAD_WEIGHT, "bad-weight", "bad weights");
    tell_rest(problems, BALI_MISSING_GROUP, "missing-group", "missing labels of folds");
    tell_rest(problems, BALI_REPEATED_HEADER, "repeated-header", "repeated headers");
    if (problems->counts[BALI_MISSING_CELL] > 0) {
        bal_error sum;
        sum_missing(problems, missing, &sum);
        bali_problems_tell(problems, &sum);
        if (missing_first) problems->first = sum;
    }
    if (failure->status != BAL_OK) bali_problems_tell(problems, failure);
    *failure = problems->first;
}
