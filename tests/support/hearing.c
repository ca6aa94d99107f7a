#include "support/hearing.h"

#include "base/memory.h"

#include <string.h>

static void close_text(hearing *h) {
    if (h->in_text) bali_text_putc(&h->heard, ']');
    h->in_text = false;
}

static void put_place(hearing *h, size_t at) {
    bal_error place = {0};
    bali_xml_place(h->xml, at, &place);
    ck_assert_uint_eq(place.line, bali_xml_line(h->xml, at));
    bali_text_printf(&h->heard, " %zu:%zu", place.line, place.column);
}

static bal_status on_start(void *context, const char *name, size_t at, bal_error *err) {
    hearing *h = context;
    if (h->deaf) return BAL_OK;
    close_text(h);
    bali_text_printf(&h->heard, "(%s", name);
    put_place(h, at);
    const char *attribute;
    for (size_t i = 0; (attribute = bali_xml_attribute_name(h->xml, i)); i++) {
        size_t length;
        const char *value = bali_xml_attribute(h->xml, attribute, &length);
        bali_text_printf(&h->heard, " %s=", attribute);
        bali_text_add(&h->heard, value, length);
    }
    if (h->stop_after > 0 && --h->stop_after == 0) return bal_error_set(err, BAL_ERR_DATA, "stop", "enough");
    return h->heard.failed ? bali_out_of_memory(err) : BAL_OK;
}

static bal_status on_text(void *context, const char *bytes, size_t length, bal_error *err) {
    hearing *h = context;
    if (h->deaf) return BAL_OK;
    if (!h->in_text) bali_text_putc(&h->heard, '[');
    h->in_text = true;
    bali_text_add(&h->heard, bytes, length);
    return h->heard.failed ? bali_out_of_memory(err) : BAL_OK;
}

static bal_status on_end(void *context, bal_error *err) {
    hearing *h = context;
    if (h->deaf) return BAL_OK;
    close_text(h);
    bali_text_putc(&h->heard, ')');
    return h->heard.failed ? bali_out_of_memory(err) : BAL_OK;
}

static void on_remark(void *context, size_t at, const char *code, const char *message) {
    hearing *h = context;
    ck_assert_uint_gt(strlen(message), 0);
    bali_text_printf(&h->heard, "!%s", code);
    put_place(h, at);
    bali_text_putc(&h->heard, ' ');
}

bal_status hear_as(hearing h, const char *bytes, size_t length, bali_text *heard, bal_error *err) {
    char *copy = bali_duplicate(bytes, length);
    if (!copy) return bali_out_of_memory(err);
    bal_status status = bali_xml_create_take("model.xml", copy, length, &h.xml, err);
    if (status == BAL_OK) {
        bali_xml_listener listener = {
            .context = &h, .expected = "BIF", .start = on_start, .text = on_text, .end = on_end, .remark = on_remark};
        status = bali_xml_parse(h.xml, &listener, err);
    } else {
        ck_assert_ptr_null(h.xml);
    }
    bali_xml_free(h.xml);
    *heard = h.heard;
    return status;
}

bal_status hear(const char *bytes, size_t length, bali_text *heard, bal_error *err) {
    return hear_as((hearing){0}, bytes, length, heard, err);
}

void expect_heard(const char *bytes, size_t length, const char *expected) {
    bali_text heard = {0};
    bal_error err = {0};
    bal_status status = hear(bytes, length, &heard, &err);
    ck_assert_msg(status == BAL_OK, "%s", err.message);
    ck_assert_str_eq(bali_text_string(&heard), expected);
    bali_text_free(&heard);
}

void expect_unheard(const char *bytes, size_t length, size_t line, size_t column, const char *code, const char *words) {
    bali_text heard = {0};
    bal_error err = {0};
    bal_status status = hear(bytes, length, &heard, &err);
    ck_assert_msg(status == BAL_ERR_SYNTAX, "status %d for a text that should say \"%s\"", (int)status, words);
    ck_assert_msg(strstr(err.message, words) != NULL, "\"%s\" lacks \"%s\"", err.message, words);
    ck_assert_msg(err.line == line && err.column == column, "%zu:%zu instead of %zu:%zu: %s", err.line, err.column,
                  line, column, err.message);
    ck_assert_str_eq(err.code, code);
    ck_assert_str_eq(err.file, "model.xml");
    bali_text_free(&heard);
}

bali_text repeated(const char *text, size_t times) {
    bali_text all = {0};
    for (size_t i = 0; i < times; i++) bali_text_puts(&all, text);
    ck_assert(!all.failed);
    return all;
}
