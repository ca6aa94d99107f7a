#include "base/hash.h"

#include "base/memory.h"

#include <sha2.h>
#include <stdint.h>

struct bali_hash {
    SHA2_CTX context;
};

bali_hash *bali_hash_create(void) {
    bali_hash *hash = bali_allocate(1, sizeof *hash);
    if (hash) SHA256Init(&hash->context);
    return hash;
}

void bali_hash_add(bali_hash *hash, const void *bytes, size_t length) {
    if (length) SHA256Update(&hash->context, bytes, length);
}

void bali_hash_take(bali_hash *hash, char text[BALI_HASH_TEXT]) {
    static const char digits[] = "0123456789abcdef";
    uint8_t digest[SHA256_DIGEST_LENGTH];
    SHA256Final(digest, &hash->context);
    SHA256Init(&hash->context);
    for (size_t i = 0; i < sizeof digest; i++) {
        text[2 * i] = digits[digest[i] >> 4];
        text[2 * i + 1] = digits[digest[i] & 15];
    }
    text[2 * sizeof digest] = '\0';
}

void bali_hash_free(bali_hash *hash) {
    bali_free(hash);
}
