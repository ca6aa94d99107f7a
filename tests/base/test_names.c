#include "base/memory.h"
#include "base/names.h"
#include "support/harness.h"

#include <stdio.h>
#include <string.h>

START_TEST(names_are_found_by_their_index) {
    enum { N = 5000 };
    static char words[N][16];
    bali_names names = {0};
    size_t first;
    ck_assert_uint_eq(bali_names_find(&names, "any", 3), BALI_NO_NAME);
    for (size_t i = 0; i < N; i++) {
        (void)snprintf(words[i], sizeof words[i], "name %zu", i * i);
        ck_assert(bali_names_add(&names, words[i], &first));
        ck_assert_uint_eq(first, BALI_NO_NAME);
    }
    for (size_t i = 0; i < N; i++) {
        ck_assert_uint_eq(bali_names_find(&names, words[i], strlen(words[i])), i);
        ck_assert_ptr_eq(names.names[i], words[i]);
    }
    ck_assert_uint_eq(bali_names_find(&names, "name", 4), BALI_NO_NAME);
    ck_assert_uint_eq(bali_names_find(&names, "name 0\0", 7), BALI_NO_NAME);
    bali_names_free(&names);
    ck_assert_uint_eq(names.n_names, 0);
    bali_names_free(&names);
}
END_TEST

START_TEST(a_name_given_twice_is_told) {
    bali_names names = {0};
    size_t first;
    char again[] = "yes";
    ck_assert(bali_names_add(&names, "no", &first));
    ck_assert(bali_names_add(&names, "yes", &first));
    ck_assert(bali_names_add(&names, again, &first));
    ck_assert_uint_eq(first, 1);
    ck_assert_uint_eq(names.n_names, 2);
    ck_assert(bali_names_add(&names, "", &first));
    ck_assert_uint_eq(first, BALI_NO_NAME);
    ck_assert_uint_eq(bali_names_find(&names, "", 0), 2);
    ck_assert_uint_eq(bali_names_find(&names, "yes and more", 3), 1);
    bali_names_free(&names);
}
END_TEST

static bal_status add_many(void *context, bal_error *err) {
    static const char *const words[] = {"a", "b", "c", "d", "e", "f", "g", "h", "i", "j", "k", "l", "m", "n", "o", "p", "q", "r", "s"};
    (void)context;
    bali_names names = {0};
    bal_status status = BAL_OK;
    for (size_t i = 0, first; i < sizeof words / sizeof words[0] && status == BAL_OK; i++) {
        if (!bali_names_add(&names, words[i], &first)) status = bali_out_of_memory(err);
        /* What was added before stays findable. */
        for (size_t j = 0; j < names.n_names; j++) ck_assert_uint_eq(bali_names_find(&names, words[j], 1), j);
    }
    bali_names_free(&names);
    return status;
}

START_TEST(no_memory_leaves_the_names_as_they_were) {
    ck_assert_uint_ge(survive_allocations(add_many, NULL), 4);
}
END_TEST

static const char *const labels[] = {"no", "yes", "maybe", "not done", "Current_Smoker", "positive", "1", "temperature above normal"};
enum { N_LABELS = sizeof labels / sizeof labels[0] };

static const struct {
    const char *text, *nearest;
} spellings[] = {
    {"mabye", "maybe"},                /* neighbours swapped: one edit */
    {"maybe", "maybe"},
    {"mayb", "maybe"},
    {"maybee", "maybe"},
    {"moybe", "maybe"},
    {"moybee", NULL},                  /* two edits in six letters */
    {"YES", "yes"},
    {"Not-Done", "not done"},
    {"notdone", "not done"},
    {"current smoker", "Current_Smoker"},
    {"CURRENTSMOKER", "Current_Smoker"},
    {"positve", "positive"},
    {"opsitiev", "positive"},          /* two swaps in eight letters */
    {"opsitie", NULL},                 /* a swap and a letter left out, in seven */
    {"temprature abov normal", "temperature above normal"},
    {"tmprature abov normal", "temperature above normal"},
    {"tmpratur abov normal", NULL},    /* four edits: beyond three, however long */
    {"2", NULL},                       /* one letter is no misspelling of another */
    {"n", NULL},
    {"mo", "no"},
    {"zzz", NULL},
    {"", NULL},
};

START_TEST(the_nearest_spelling_is_offered) {
    size_t found = bali_nearest(spellings[_i].text, strlen(spellings[_i].text), labels, N_LABELS);
    const char *name = found == BALI_NO_NAME ? "(none)" : labels[found];
    ck_assert_str_eq(name, spellings[_i].nearest ? spellings[_i].nearest : "(none)");
}
END_TEST

START_TEST(the_closest_of_several_wins) {
    static const char *const close[] = {"abcdefxx", "abcdefgx", "ABCDEFGH"};
    ck_assert_uint_eq(bali_nearest("abcdefgy", 8, close, 3), 1);
    ck_assert_uint_eq(bali_nearest("abcdefgh", 8, close, 3), 2); /* differs in case only */
    ck_assert_uint_eq(bali_nearest("abcdefgh", 8, close, 0), BALI_NO_NAME);
}
END_TEST

START_TEST(long_texts_are_not_compared) {
    static char text[300], name[300];
    memset(text, 'x', 299);
    memset(name, 'x', 255);
    const char *const names[] = {name};
    ck_assert_uint_eq(bali_nearest(text, 255, names, 1), 0);
    ck_assert_uint_eq(bali_nearest(text, 256, names, 1), BALI_NO_NAME);
    memset(name, 'x', 256);
    ck_assert_uint_eq(bali_nearest(text, 255, names, 1), BALI_NO_NAME);
}
END_TEST

/* The slow twin: edits by recursion over the definition (Damerau 1964, Levenshtein 1966; adjacent swaps, once each). */
static size_t edits(const char *a, size_t n, const char *b, size_t m) {
    if (n == 0 || m == 0) return n + m;
    size_t best = edits(a, n - 1, b, m - 1) + (a[n - 1] != b[m - 1]);
    size_t other = edits(a, n - 1, b, m) + 1;
    if (other < best) best = other;
    other = edits(a, n, b, m - 1) + 1;
    if (other < best) best = other;
    if (n > 1 && m > 1 && a[n - 1] == b[m - 2] && a[n - 2] == b[m - 1]) {
        other = edits(a, n - 2, b, m - 2) + 1;
        if (other < best) best = other;
    }
    return best;
}

START_TEST(distance_agrees_with_its_definition) {
    /* All pairs of words of 2 to 5 letters over {a, b}: within one edit or not. */
    for (unsigned n = 2; n <= 5; n++) {
        for (unsigned m = 2; m <= 5; m++) {
            for (unsigned x = 0; x < 1u << (n + m); x++) {
                char a[6] = "", b[6] = "";
                for (unsigned i = 0; i < n; i++) a[i] = x >> i & 1 ? 'a' : 'b';
                for (unsigned i = 0; i < m; i++) b[i] = x >> (n + i) & 1 ? 'a' : 'b';
                const char *const names[] = {b};
                bool near_enough = edits(a, n, b, m) <= 1;
                if ((bali_nearest(a, n, names, 1) == 0) != near_enough) ck_abort_msg("%s %s: %zu edits", a, b, edits(a, n, b, m));
            }
        }
    }
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("names");
    TCase *tests = tcase_create("names");
    tcase_add_test(tests, names_are_found_by_their_index);
    tcase_add_test(tests, a_name_given_twice_is_told);
    tcase_add_test(tests, no_memory_leaves_the_names_as_they_were);
    tcase_add_loop_test(tests, the_nearest_spelling_is_offered, 0, (int)(sizeof spellings / sizeof spellings[0]));
    tcase_add_test(tests, the_closest_of_several_wins);
    tcase_add_test(tests, long_texts_are_not_compared);
    tcase_add_test(tests, distance_agrees_with_its_definition);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
