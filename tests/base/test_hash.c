#include "base/hash.h"
#include "base/memory.h"
#include "support/harness.h"

#include <string.h>

/* FIPS 180-2, appendix B (one block, two blocks, a million a); the empty message is in NIST's SHAVS files. Recalled from
 * memory and agreed with coreutils' sha256sum. */
static const struct {
    const char *piece;
    size_t times;
    const char *digest;
} known[] = {
    {"", 0, "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855"},
    {"abc", 1, "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"},
    {"abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq", 1, "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1"},
    {"a", 1000000, "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0"},
};

START_TEST(digests_are_known) {
    bali_hash *hash = bali_hash_create();
    char text[BALI_HASH_TEXT];
    for (int again = 0; again < 2; again++) { /* taking starts anew */
        for (size_t i = 0; i < known[_i].times; i++) bali_hash_add(hash, known[_i].piece, strlen(known[_i].piece));
        bali_hash_add(hash, NULL, 0);
        bali_hash_take(hash, text);
        ck_assert_str_eq(text, known[_i].digest);
    }
    bali_hash_free(hash);
}
END_TEST

START_TEST(pieces_do_not_matter) {
    char bytes[300], whole[BALI_HASH_TEXT], pieces[BALI_HASH_TEXT];
    for (size_t i = 0; i < sizeof bytes; i++) bytes[i] = (char)(i * 7);
    bali_hash *hash = bali_hash_create();
    bali_hash_add(hash, bytes, sizeof bytes);
    bali_hash_take(hash, whole);
    for (size_t cut = 0; cut <= sizeof bytes; cut++) {
        bali_hash_add(hash, bytes, cut);
        bali_hash_add(hash, bytes + cut, sizeof bytes - cut);
        bali_hash_take(hash, pieces);
        ck_assert_str_eq(pieces, whole);
    }
    bali_hash_free(hash);
    bali_hash_free(NULL);
}
END_TEST

START_TEST(no_memory_gives_nothing) {
    bali_memory_fail_at(1);
    bali_hash *hash = bali_hash_create();
    bali_memory_fail_at(0);
    ck_assert_ptr_null(hash);
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("hash");
    TCase *tests = tcase_create("hash");
    tcase_add_loop_test(tests, digests_are_known, 0, (int)(sizeof known / sizeof known[0]));
    tcase_add_test(tests, pieces_do_not_matter);
    tcase_add_test(tests, no_memory_gives_nothing);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
