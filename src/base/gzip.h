/* The bytes of an input, decompressed on the way where they are gzip (RFC 1952). */
#ifndef BASE_GZIP_H
#define BASE_GZIP_H

#include "base/files.h"

#define BALI_GZIP_RATIO 200u                           /* bytes out for one in ... */
#define BALI_GZIP_FREE_BYTES ((uint64_t)10 * 1000 * 1000) /* ... beyond this many bytes out */

/** An input whose gzip data come out as plain bytes, member after member; other data come through as they are. */
typedef struct bali_gzip bali_gzip;

/** Who sees the bytes of the medium as they are there, in order. */
typedef struct bali_gzip_watch {
    void (*saw)(void *context, const char *bytes, size_t length);
    void *context;
} bali_gzip_watch;

/**
 * Begins at the start of an input, which is borrowed and from now on read through this only.
 *
 * Fails: MEMORY.
 */
BAL_MUST_CHECK bal_status bali_gzip_create(bali_input *input, bali_gzip_watch watch, bali_gzip **out, bal_error *err);

/**
 * The next plain bytes, as bali_input_read gives them: *length < size only at the end.
 *
 * Fails:  as bali_input_read; SYNTAX "bad-gzip" where the data are damaged, cut short or followed by something else, with the
 *         file and the byte; DATA "gzip-ratio" beyond BALI_GZIP_RATIO; MEMORY.
 * Cost:   about 100 KiB of memory for gzip data, whatever they hold.
 * Source: RFC 1951 and RFC 1952 (1996), by zlib.
 */
BAL_MUST_CHECK bal_status bali_gzip_read(bali_gzip *gzip, void *bytes, size_t size, size_t *length, bal_error *err);

/** Whether the data are gzip. Known once something was read. */
bool bali_gzip_is_packed(const bali_gzip *gzip);

/** To a byte of data that are not gzip, something of which was read. Fails: as bali_input_seek. */
BAL_MUST_CHECK bal_status bali_gzip_seek(bali_gzip *gzip, uint64_t position, bal_error *err);

/** Back to the start. Fails: as bali_input_rewind. */
BAL_MUST_CHECK bal_status bali_gzip_rewind(bali_gzip *gzip, bal_error *err);
void bali_gzip_free(bali_gzip *gzip);

#endif
