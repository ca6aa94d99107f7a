#include "base/json.h"

#include "base/numbers.h"

#include <assert.h>
#include <math.h>
#include <string.h>

enum { DEEPEST = 64 };

static uint64_t level_bit(unsigned depth) {
    return (uint64_t)1 << (depth - 1);
}

static bool in_object(const bali_json *json) {
    return json->depth > 0 && (json->objects & level_bit(json->depth)) != 0;
}

static void new_line(bali_json *json) {
    bali_text_putc(&json->text, '\n');
    for (unsigned i = 0; i < json->depth; i++) bali_text_puts(&json->text, "  ");
}

/* JSON text (RFC 8259, section 7). What could steer a terminal is escaped as well; all of that lies below U+10000. */
static void put_string(bali_text *text, const char *value, size_t length) {
    bali_text_putc(text, '"');
    for (size_t i = 0; i < length;) {
        uint32_t character;
        size_t size = bali_utf8_next(value + i, length - i, &character);
        if (size == 0) bali_text_puts(text, "\xEF\xBF\xBD");
        else if (character == '"' || character == '\\') bali_text_printf(text, "\\%c", (char)character);
        else if (character == '\n') bali_text_puts(text, "\\n");
        else if (character == '\t') bali_text_puts(text, "\\t");
        else if (bali_is_control(character)) bali_text_printf(text, "\\u%04x", (unsigned)character);
        else bali_text_add(text, value + i, size);
        i += size ? size : 1;
    }
    bali_text_putc(text, '"');
}

/* What stands before a value: a comma after the one before, a new line unless it is one of an array of numbers, its key. */
static void begin_value(bali_json *json, const char *key, bool on_line) {
    assert(json->depth > 0 || json->text.length == 0 || json->text.failed); /* a document is one value */
    assert(in_object(json) == (key != NULL));
    bool stays = on_line && json->inline_array;
    if (json->depth > 0 && !json->first) bali_text_puts(&json->text, stays ? ", " : ",");
    if (json->depth > 0 && !stays) new_line(json);
    json->inline_array = stays;
    json->first = false;
    if (!key) return;
    put_string(&json->text, key, strlen(key));
    bali_text_puts(&json->text, ": ");
}

/* A value alone is a document, and a document ends with a new line. */
static void end_value(bali_json *json) {
    if (json->depth == 0) bali_text_putc(&json->text, '\n');
}

static void open_level(bali_json *json, const char *key, bool object) {
    begin_value(json, key, false);
    assert(json->depth < DEEPEST);
    bali_text_putc(&json->text, object ? '{' : '[');
    json->depth++;
    json->objects = object ? json->objects | level_bit(json->depth) : json->objects & ~level_bit(json->depth);
    json->first = true;
    json->inline_array = !object;
}

static void close_level(bali_json *json) {
    assert(json->depth > 0);
    bool on_line = json->first || json->inline_array, object = in_object(json);
    json->depth--;
    if (!on_line) new_line(json);
    bali_text_putc(&json->text, object ? '}' : ']');
    json->first = json->inline_array = false;
    end_value(json);
}

void bali_json_object(bali_json *json, const char *key) {
    open_level(json, key, true);
}

void bali_json_array(bali_json *json, const char *key) {
    open_level(json, key, false);
}

void bali_json_end_object(bali_json *json) {
    assert(in_object(json));
    close_level(json);
}

void bali_json_end_array(bali_json *json) {
    assert(!in_object(json));
    close_level(json);
}

void bali_json_string(bali_json *json, const char *key, const char *value) {
    if (!value) {
        bali_json_null(json, key);
        return;
    }
    begin_value(json, key, false);
    put_string(&json->text, value, strlen(value));
    end_value(json);
}

void bali_json_number(bali_json *json, const char *key, double value) {
    begin_value(json, key, true);
    if (isfinite(value)) bali_text_put_number(&json->text, value);
    else bali_text_puts(&json->text, "null");
    end_value(json);
}

void bali_json_whole(bali_json *json, const char *key, uint64_t value) {
    begin_value(json, key, true);
    bali_text_printf(&json->text, "%llu", (unsigned long long)value);
    end_value(json);
}

void bali_json_boolean(bali_json *json, const char *key, bool value) {
    begin_value(json, key, true);
    bali_text_puts(&json->text, value ? "true" : "false");
    end_value(json);
}

void bali_json_null(bali_json *json, const char *key) {
    begin_value(json, key, true);
    bali_text_puts(&json->text, "null");
    end_value(json);
}

void bali_json_numbers(bali_json *json, const char *key, const double *values, size_t n) {
    bali_json_array(json, key);
    for (size_t i = 0; i < n; i++) bali_json_number(json, NULL, values[i]);
    bali_json_end_array(json);
}

void bali_json_free(bali_json *json) {
    bali_text_free(&json->text);
    *json = (bali_json){0};
}
