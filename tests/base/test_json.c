#include "base/json.h"
#include "base/memory.h"
#include "support/harness.h"

#include <math.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

START_TEST(a_document_is_laid_out) {
    static const double values[] = {0.25, 1, NAN, -INFINITY, 1.0 / 3};
    bali_json json = {0};
    bali_json_object(&json, NULL);
    bali_json_string(&json, "name", "demo \"net\"");
    bali_json_object(&json, "empty");
    bali_json_end_object(&json);
    bali_json_array(&json, "none");
    bali_json_end_array(&json);
    bali_json_numbers(&json, "mean", values, 5);
    bali_json_numbers(&json, "no numbers", values, 0);
    bali_json_array(&json, "parents");
    bali_json_string(&json, NULL, "age");
    bali_json_string(&json, NULL, "smoker");
    bali_json_end_array(&json);
    bali_json_array(&json, "rows");
    for (unsigned i = 0; i < 2; i++) {
        bali_json_object(&json, NULL);
        bali_json_whole(&json, "records", i ? UINT64_MAX : 0);
        bali_json_boolean(&json, "few", i == 0);
        bali_json_end_object(&json);
    }
    bali_json_end_array(&json);
    bali_json_string(&json, "ess", NULL);
    bali_json_null(&json, "nothing");
    bali_json_number(&json, "number", -2.5e-300);
    bali_json_end_object(&json);
    ck_assert_str_eq(bali_text_string(&json.text),
                     "{\n"
                     "  \"name\": \"demo \\\"net\\\"\",\n"
                     "  \"empty\": {},\n"
                     "  \"none\": [],\n"
                     "  \"mean\": [0.25, 1, null, null, 0.3333333333333333],\n"
                     "  \"no numbers\": [],\n"
                     "  \"parents\": [\n"
                     "    \"age\",\n"
                     "    \"smoker\"\n"
                     "  ],\n"
                     "  \"rows\": [\n"
                     "    {\n"
                     "      \"records\": 0,\n"
                     "      \"few\": true\n"
                     "    },\n"
                     "    {\n"
                     "      \"records\": 18446744073709551615,\n"
                     "      \"few\": false\n"
                     "    }\n"
                     "  ],\n"
                     "  \"ess\": null,\n"
                     "  \"nothing\": null,\n"
                     "  \"number\": -2.5e-300\n"
                     "}\n");
    ck_assert_uint_eq(json.depth, 0);
    bali_json_free(&json);
    ck_assert_ptr_null(json.text.bytes);
}
END_TEST

START_TEST(mixed_arrays_are_laid_out) {
    bali_json json = {0};
    bali_json_array(&json, NULL);
    bali_json_number(&json, NULL, 1);
    bali_json_null(&json, NULL);
    bali_json_string(&json, NULL, "a");
    bali_json_number(&json, NULL, 2);
    bali_json_array(&json, NULL);
    bali_json_whole(&json, NULL, 3);
    bali_json_boolean(&json, NULL, true);
    bali_json_end_array(&json);
    bali_json_whole(&json, NULL, 4);
    bali_json_end_array(&json);
    ck_assert_str_eq(bali_text_string(&json.text), "[1, null,\n  \"a\",\n  2,\n  [3, true],\n  4\n]\n");
    bali_json_free(&json);
}
END_TEST

START_TEST(a_value_alone_is_a_document) {
    bali_json json = {0};
    bali_json_whole(&json, NULL, 7);
    ck_assert_str_eq(bali_text_string(&json.text), "7\n");
    bali_json_free(&json);
}
END_TEST

/* Source: RFC 8259, section 7. */
static const struct {
    const char *given, *written;
} strings[] = {
    {"", "\"\""},
    {"\xC3\xA9\xF0\x9F\x98\x80/", "\"\xC3\xA9\xF0\x9F\x98\x80/\""},
    {"a\"b\\c", "\"a\\\"b\\\\c\""},
    {"\n\t\r\b\x01\x1F", "\"\\n\\t\\u000d\\u0008\\u0001\\u001f\""},
    {"\033[31m\x7F", "\"\\u001b[31m\\u007f\""},
    {"\xE2\x80\xAE\xE2\x80\xA8\xEF\xBB\xBF", "\"\\u202e\\u2028\\ufeff\""},
    {"\xFFz\xED\xA0\x80", "\"\xEF\xBF\xBDz\xEF\xBF\xBD\xEF\xBF\xBD\xEF\xBF\xBD\""},
    {"</script>", "\"</script>\""},
};

START_TEST(strings_are_escaped) {
    bali_json json = {0};
    bali_json_object(&json, NULL);
    bali_json_string(&json, strings[_i].given, strings[_i].given);
    bali_json_end_object(&json);
    char wanted[300];
    (void)snprintf(wanted, sizeof wanted, "{\n  %s: %s\n}\n", strings[_i].written, strings[_i].written);
    ck_assert_str_eq(bali_text_string(&json.text), wanted);
    bali_json_free(&json);
}
END_TEST

/* Builds a document by chance: every kind of value, nested up to ten deep. */
static void build(bali_json *json, unsigned *chance, const char *key, int depth) {
    *chance = *chance * 1103515245u + 12345u;
    unsigned kind = *chance >> 16 & 7, n = *chance >> 20 & 3;
    char bytes[8];
    (void)snprintf(bytes, sizeof bytes, "%c%c%c", (int)(1 + (*chance >> 8) % 255), (int)(1 + (*chance >> 12) % 127),
                   (int)(1 + (*chance >> 16) % 255));
    if (kind < 4 && depth < 10) {
        bool object = kind < 2;
        if (object) bali_json_object(json, key);
        else bali_json_array(json, key);
        for (unsigned i = 0; i <= n; i++) {
            char name[8];
            (void)snprintf(name, sizeof name, "%u", i);
            build(json, chance, object ? name : NULL, depth + 1);
        }
        if (object) bali_json_end_object(json);
        else bali_json_end_array(json);
    } else if (kind == 5) {
        bali_json_string(json, key, bytes);
    } else if (kind == 6) {
        bali_json_boolean(json, key, n & 1);
    } else if (kind == 7) {
        bali_json_number(json, key, n == 0 ? NAN : (double)*chance * 1e-7);
    } else {
        bali_json_whole(json, key, *chance);
    }
}

/* The referee is python3's json module, which is no part of this project. */
START_TEST(an_independent_reader_accepts_it) {
    bali_json json = {0};
    unsigned chance = 1;
    bali_json_array(&json, NULL);
    for (size_t i = 0; i < sizeof strings / sizeof strings[0]; i++) bali_json_string(&json, NULL, strings[i].given);
    for (int i = 0; i < 300; i++) build(&json, &chance, NULL, 0);
    bali_json_end_array(&json);
    char path[512], command[1200];
    (void)snprintf(path, sizeof path, "%s", scratch_file("document.json", json.text.bytes, json.text.length));
    bali_json_free(&json);
    (void)snprintf(command, sizeof command,
                   "python3 -c 'import json,sys\n"
                   "def no(word): raise ValueError(word)\n"
                   "d = json.load(open(sys.argv[1], encoding=\"utf-8\"), parse_constant=no)\n"
                   "sys.exit(0 if len(d) == %zu and d[2] == \"a\\\"b\\\\c\" and d[5] == \"\\u202e\\u2028\\ufeff\" else 1)' '%s'",
                   300 + sizeof strings / sizeof strings[0], path);
    ck_assert_msg(system("command -v python3 >/dev/null") == 0, "this test needs python3");
    ck_assert_int_eq(system(command), 0);
}
END_TEST

static bal_status write_some(void *context, bal_error *err) {
    (void)context;
    bali_json json = {0};
    bali_json_array(&json, NULL);
    for (int i = 0; i < 40; i++) bali_json_string(&json, NULL, "a\n\x01");
    bali_json_end_array(&json);
    bal_status status = json.text.failed ? bali_out_of_memory(err) : BAL_OK;
    bali_json_free(&json);
    return status;
}

START_TEST(no_memory_is_remembered) {
    ck_assert_uint_ge(survive_allocations(write_some, NULL), 3);
}
END_TEST

#ifdef NDEBUG
static const bool asserted = false;
#else
static const bool asserted = true;
#endif

/* Misuse is asserted; each of these ends the process in a build with assertions. */
START_TEST(misuse_is_asserted) {
    bali_json json = {0};
    ck_assert_ptr_nonnull(freopen("/dev/null", "w", stderr)); /* what assert says is expected */
    switch (_i) {
    case 0: bali_json_end_object(&json); break;
    case 1: bali_json_object(&json, "key at the top"); break;
    case 2: bali_json_object(&json, NULL), bali_json_whole(&json, NULL, 1); break;
    case 3: bali_json_array(&json, NULL), bali_json_whole(&json, "key", 1); break;
    case 4: bali_json_array(&json, NULL), bali_json_end_object(&json); break;
    case 5: bali_json_object(&json, NULL), bali_json_end_array(&json); break;
    case 6: bali_json_whole(&json, NULL, 1), bali_json_whole(&json, NULL, 2); break;
    default:
        for (int depth = 0; depth < 65; depth++) bali_json_array(&json, NULL);
    }
    bali_json_free(&json);
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("json");
    TCase *tests = tcase_create("json");
    tcase_add_test(tests, a_document_is_laid_out);
    tcase_add_test(tests, mixed_arrays_are_laid_out);
    tcase_add_test(tests, a_value_alone_is_a_document);
    tcase_add_loop_test(tests, strings_are_escaped, 0, (int)(sizeof strings / sizeof strings[0]));
    tcase_add_test(tests, an_independent_reader_accepts_it);
    tcase_add_test(tests, no_memory_is_remembered);
    const char *fork = getenv("CK_FORK");
    if (asserted && !(fork && strcmp(fork, "no") == 0)) tcase_add_loop_test_raise_signal(tests, misuse_is_asserted, SIGABRT, 0, 8);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
