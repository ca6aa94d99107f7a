#include "base/names.h"
#include "formats/spelling.h"
#include "support/harness.h"

#include <string.h>

typedef struct pair {
    const char *a, *b;
    bali_difference difference;
} pair;

static const pair pairs[] = {
    {"Yes", "yes", BALI_DIFFERS_IN_CASE},
    {"caf\xC3\xA9 A", "caf\xC3\xA9 a", BALI_DIFFERS_IN_CASE},
    {"no test", "notest", BALI_DIFFERS_IN_BLANKS},
    {"no\xC2\xA0test", "no test", BALI_DIFFERS_IN_BLANKS},     /* no-break space */
    {"yes\xE2\x80\x8B", "yes", BALI_DIFFERS_IN_BLANKS},         /* zero width space */
    {"\xEF\xBB\xBFyes", "yes", BALI_DIFFERS_IN_BLANKS},         /* byte order mark */
    {"No\nTest", "no test", BALI_DIFFERS_IN_BOTH},
    {"caf\xC3\xA9", "cafe\xCC\x81", BALI_DIFFERS_IN_ENCODING},
    {"cafe\xCC\x81s", "caf\xC3\xA9s", BALI_DIFFERS_IN_ENCODING},
    {"\xC3\xA9t\xC3\xA9", "\xC3\xA9te\xCC\x81", BALI_DIFFERS_IN_ENCODING},
    {"\xE1\xBB\x87", "e\xCC\xA3\xCC\x82", BALI_DIFFERS_IN_ENCODING}, /* U+1EC7 is e with two marks */
    {"\xD0\xB9", "\xD0\xB8\xCC\x86", BALI_DIFFERS_IN_ENCODING},      /* Cyrillic short i */
    {"caf\xC3\xA9", "cafo\xCC\x81", BALI_DIFFERENT},                 /* another letter under the mark */
    {"caf\xC3\xA9", "cafe", BALI_DIFFERENT},
    {"\xC3\x9F", "s\xCC\x81", BALI_DIFFERENT},                       /* sharp s is not composed */
    {"cafe\xCC\x81", "cafe", BALI_DIFFERENT},
    {"yes", "no", BALI_DIFFERENT},
    {"yes", "yes!", BALI_DIFFERENT},
    {"", "a", BALI_DIFFERENT},
};

START_TEST(differences_are_named) {
    const pair *p = &pairs[_i];
    ck_assert_int_eq(bali_spelling_difference(p->a, strlen(p->a), p->b, strlen(p->b)), p->difference);
    ck_assert_int_eq(bali_spelling_difference(p->b, strlen(p->b), p->a, strlen(p->a)), p->difference);
    ck_assert((bali_difference_words(p->difference) == NULL) == (p->difference == BALI_DIFFERENT));
}
END_TEST

START_TEST(the_nearest_name_is_found) {
    static const char *const names[] = {"yes", "no", "caf\xC3\xA9", "not recorded"};
    static const struct {
        const char *text;
        size_t nearest;
        bali_difference how;
    } cases[] = {
        {"YES", 0, BALI_DIFFERS_IN_CASE},    {"cafe\xCC\x81", 2, BALI_DIFFERS_IN_ENCODING},
        {"notrecorded", 3, BALI_DIFFERS_IN_BLANKS}, {"not rekorded", 3, BALI_DIFFERENT},
        {"quite another text", BALI_NO_NAME, BALI_DIFFERENT}, {"", BALI_NO_NAME, BALI_DIFFERENT},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        bali_difference how;
        ck_assert_uint_eq(bali_spelling_nearest(cases[i].text, strlen(cases[i].text), names, 4, &how), cases[i].nearest);
        ck_assert_int_eq(how, cases[i].how);
    }
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("spelling");
    TCase *tests = tcase_create("spelling");
    tcase_add_loop_test(tests, differences_are_named, 0, sizeof pairs / sizeof pairs[0]);
    tcase_add_test(tests, the_nearest_name_is_found);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
