/* SHA-256 (FIPS 180-4), by libmd. */
#ifndef BASE_HASH_H
#define BASE_HASH_H

#include <stddef.h>

#define BALI_HASH_TEXT 65

typedef struct bali_hash bali_hash;

/** NULL when there is no memory. */
bali_hash *bali_hash_create(void);
void bali_hash_add(bali_hash *hash, const void *bytes, size_t length);
/** The digest of what was added so far as 64 lower-case hexadecimal digits and a NUL; starts anew. */
void bali_hash_take(bali_hash *hash, char text[BALI_HASH_TEXT]);
void bali_hash_free(bali_hash *hash);

#endif
