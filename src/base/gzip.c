#include "base/gzip.h"

#include "base/memory.h"

#include <inttypes.h>
#include <string.h>
#include <zlib.h>

enum { PACKED_BYTES = 1 << 16, MAGIC_BYTES = 2, LARGEST_WINDOW = 15, GZIP_ONLY = 16 };

struct bali_gzip {
    bali_input *input;
    bali_gzip_watch watch;
    bool looked;      /* at the first bytes */
    bool is_gzip;
    bool has_stream;  /* zlib's state exists */
    bool in_member;   /* a member has begun and not ended */
    z_stream stream;
    char magic[MAGIC_BYTES]; /* of plain data: what was looked at and not yet given */
    size_t n_magic, magic_at;
    char *packed;        /* read and not yet decompressed, from stream.next_in on */
    bool packed_ends;    /* the input has no further bytes */
    uint64_t given;      /* plain bytes */
};

static voidpf allocate(voidpf opaque, uInt items, uInt size) {
    (void)opaque;
    return bali_allocate(items, size);
}

static void release(voidpf opaque, voidpf memory) {
    (void)opaque;
    bali_free(memory);
}

bal_status bali_gzip_create(bali_input *input, bali_gzip_watch watch, bali_gzip **out, bal_error *err) {
    *out = bali_allocate(1, sizeof **out);
    if (!*out) return bali_out_of_memory(err);
    (*out)->input = input;
    (*out)->watch = watch;
    return BAL_OK;
}

void bali_gzip_free(bali_gzip *gzip) {
    if (!gzip) return;
    if (gzip->has_stream) (void)inflateEnd(&gzip->stream);
    bali_free(gzip->packed);
    bali_free(gzip);
}

bal_status bali_gzip_rewind(bali_gzip *gzip, bal_error *err) {
    bal_status status = bali_input_rewind(gzip->input, err);
    if (status != BAL_OK) return status;
    if (gzip->has_stream) (void)inflateReset(&gzip->stream);
    gzip->stream.avail_in = 0;
    gzip->looked = gzip->in_member = gzip->packed_ends = false;
    gzip->n_magic = gzip->magic_at = 0;
    gzip->given = 0;
    return BAL_OK;
}

bool bali_gzip_is_packed(const bali_gzip *gzip) {
    return gzip->is_gzip;
}

bal_status bali_gzip_seek(bali_gzip *gzip, uint64_t position, bal_error *err) {
    gzip->n_magic = gzip->magic_at = 0;
    gzip->given = position;
    return bali_input_seek(gzip->input, position, err);
}

static bal_status read_medium(bali_gzip *gzip, char *bytes, size_t size, size_t *length, bal_error *err) {
    bal_status status = bali_input_read(gzip->input, bytes, size, length, err);
    if (status == BAL_OK && *length > 0 && gzip->watch.saw) gzip->watch.saw(gzip->watch.context, bytes, *length);
    return status;
}

static bal_status make_stream(bali_gzip *gzip, bal_error *err) {
    if (!gzip->packed) gzip->packed = bali_allocate(PACKED_BYTES, 1);
    if (!gzip->packed) return bali_out_of_memory(err);
    if (gzip->has_stream) return BAL_OK;
    gzip->stream = (z_stream){.zalloc = allocate, .zfree = release};
    if (inflateInit2(&gzip->stream, LARGEST_WINDOW + GZIP_ONLY) != Z_OK) return bali_out_of_memory(err);
    gzip->has_stream = true;
    return BAL_OK;
}

/* Reads the first two bytes, which tell gzip data. */
static bal_status look(bali_gzip *gzip, bal_error *err) {
    bal_status status = read_medium(gzip, gzip->magic, MAGIC_BYTES, &gzip->n_magic, err);
    if (status != BAL_OK) return status;
    gzip->is_gzip = gzip->n_magic == MAGIC_BYTES && memcmp(gzip->magic, "\x1F\x8B", MAGIC_BYTES) == 0;
    if (gzip->is_gzip) {
        status = make_stream(gzip, err);
        if (status != BAL_OK) return status;
        memcpy(gzip->packed, gzip->magic, MAGIC_BYTES);
        gzip->stream.next_in = (Bytef *)gzip->packed;
        gzip->stream.avail_in = MAGIC_BYTES;
    }
    gzip->looked = true;
    return BAL_OK;
}

static bal_status read_plain(bali_gzip *gzip, char *bytes, size_t size, size_t *length, bal_error *err) {
    size_t n = gzip->n_magic - gzip->magic_at;
    if (n > size) n = size;
    memcpy(bytes, gzip->magic + gzip->magic_at, n);
    gzip->magic_at += n;
    *length = n;
    if (n == size) return BAL_OK;
    size_t got;
    bal_status status = read_medium(gzip, bytes + n, size - n, &got, err);
    *length += got;
    return status;
}

/* Bytes of the medium that zlib has taken. */
static uint64_t taken(const bali_gzip *gzip) {
    return bali_input_position(gzip->input) - gzip->stream.avail_in;
}

static bal_status refuse_gzip(const bali_gzip *gzip, bal_status status, const char *code, const char *what, bal_error *err) {
    (void)bal_error_set(err, status, code, "%s (at byte %" PRIu64 " of the compressed file)", what, taken(gzip));
    bal_error_place(err, bali_input_name(gzip->input), 0, 0);
    return err ? err->status : status;
}

static bal_status damaged(const bali_gzip *gzip, bal_error *err) {
    return refuse_gzip(gzip, BAL_ERR_SYNTAX, "bad-gzip", "the gzip data are damaged; fetch or compress the file again", err);
}

static bal_status check_ratio(const bali_gzip *gzip, bal_error *err) {
    if (gzip->given <= BALI_GZIP_FREE_BYTES || gzip->given / BALI_GZIP_RATIO <= taken(gzip)) return BAL_OK;
    return refuse_gzip(gzip, BAL_ERR_DATA, "gzip-ratio",
                  "the gzip data grow to more than 200 times their size; if that is meant, decompress the file first (gunzip)", err);
}

/* Makes sure that there are packed bytes at hand unless the input ended. */
static bal_status need_packed(bali_gzip *gzip, bal_error *err) {
    if (gzip->stream.avail_in > 0 || gzip->packed_ends) return BAL_OK;
    size_t got;
    bal_status status = read_medium(gzip, gzip->packed, PACKED_BYTES, &got, err);
    if (status != BAL_OK) return status;
    gzip->packed_ends = got < PACKED_BYTES;
    gzip->stream.next_in = (Bytef *)gzip->packed;
    gzip->stream.avail_in = (uInt)got;
    return BAL_OK;
}

/* Begins the next member; *more is false when the last one was the end. */
static bal_status begin_member(bali_gzip *gzip, bool *more, bal_error *err) {
    *more = gzip->stream.avail_in > 0;
    if (!*more) return BAL_OK;
    if (gzip->given > 0 && gzip->stream.next_in[0] != 0x1F)
        return refuse_gzip(gzip, BAL_ERR_SYNTAX, "bad-gzip",
                           "something else stands behind the gzip data; remove it, or compress the file again", err);
    if (inflateReset(&gzip->stream) != Z_OK) return damaged(gzip, err);
    gzip->in_member = true;
    return BAL_OK;
}

/* Decompresses once, as far as room and the packed bytes at hand allow. */
static bal_status inflate_once(bali_gzip *gzip, char *bytes, size_t size, size_t *length, bal_error *err) {
    z_stream *stream = &gzip->stream;
    uInt room = size < PACKED_BYTES ? (uInt)size : PACKED_BYTES;
    stream->next_out = (Bytef *)bytes;
    stream->avail_out = room;
    int result = inflate(stream, Z_NO_FLUSH);
    *length = room - stream->avail_out;
    gzip->given += *length;
    if (result == Z_MEM_ERROR) return bali_out_of_memory(err);
    if (result == Z_STREAM_END) gzip->in_member = false;
    else if (result != Z_OK && result != Z_BUF_ERROR) return damaged(gzip, err);
    if (gzip->in_member && *length == 0 && stream->avail_in == 0 && gzip->packed_ends)
        return refuse_gzip(gzip, BAL_ERR_SYNTAX, "bad-gzip", "the gzip data end too early; fetch or compress the file again", err);
    return check_ratio(gzip, err);
}

static bal_status read_packed(bali_gzip *gzip, char *bytes, size_t size, size_t *length, bal_error *err) {
    while (*length < size) {
        size_t got;
        bool more = true;
        bal_status status = need_packed(gzip, err);
        if (status == BAL_OK && !gzip->in_member) status = begin_member(gzip, &more, err);
        if (status != BAL_OK || !more) return status;
        status = inflate_once(gzip, bytes + *length, size - *length, &got, err);
        *length += got;
        if (status != BAL_OK) return status;
    }
    return BAL_OK;
}

bal_status bali_gzip_read(bali_gzip *gzip, void *bytes, size_t size, size_t *length, bal_error *err) {
    *length = 0;
    bal_status status = gzip->looked ? BAL_OK : look(gzip, err);
    if (status != BAL_OK) return status;
    return gzip->is_gzip ? read_packed(gzip, bytes, size, length, err) : read_plain(gzip, bytes, size, length, err);
}
