#include "formats/xmlbif.h"

#include "base/files.h"
#include "base/hash.h"
#include "base/memory.h"
#include "base/output.h"

#include <stdio.h>
#include <string.h>

static const size_t largest_file = (size_t)512 << 20;

bal_network_options bal_network_options_defaults(void) {
    return (bal_network_options){.max_cells = 0, .for_slowest = false, .notices = NULL};
}

static bal_status take_facts(const char *path, const char *bytes, size_t length, bal_file_facts *facts,
                             bal_error *err) {
    bali_hash *hash = bali_hash_create();
    if (!hash) return bali_out_of_memory(err);
    bali_hash_add(hash, bytes, length);
    bali_hash_take(hash, facts->sha256);
    bali_hash_free(hash);
    facts->bytes = length;
    (void)snprintf(facts->name, sizeof facts->name, "%s", bali_base_name(path));
    return BAL_OK;
}

bal_status bali_xmlbif_document(bali_xml *xml, const bal_network_options *options, bal_document **out, bal_error *err) {
    *out = NULL;
    bali_draft draft = {.xml = xml};
    bali_remarks remarks = {.notices = options->notices, .xml = xml};
    size_t max_cells = options->max_cells ? options->max_cells : BAL_DEFAULT_MAX_CELLS;
    bal_status status = bali_xmlbif_read(&draft, max_cells, &remarks, err);
    if (status == BAL_OK) status = bali_draft_resolve(&draft, options, &remarks, out, err);
    bali_remarks_close(&remarks);
    bali_draft_free(&draft);
    return status;
}

/* XML begins with < behind blanks and a byte order mark. Whatever else begins otherwise is refused by its first bytes, so an endless
 * file is not worth more of them. */
static bool may_be_xml(const char *bytes, size_t length) {
    size_t i = length >= 3 && memcmp(bytes, "\xEF\xBB\xBF", 3) == 0 ? 3 : 0;
    while (i < length && memchr(" \t\r\n", bytes[i], 4)) i++;
    return i < length && bytes[i] == '<';
}

bal_status bal_document_read(const char *path, const bal_network_options *options, bal_document **out,
                             bal_file_facts *facts, bal_error *err) {
    *out = NULL;
    if (facts) *facts = (bal_file_facts){0};
    bal_network_options defaults = bal_network_options_defaults();
    bal_file_facts found = {0};
    char *bytes = NULL;
    size_t length = 0;
    bali_xml *xml = NULL;
    bal_status status = bali_read_while(path, largest_file, may_be_xml, &bytes, &length, err);
    if (status == BAL_OK && facts) status = take_facts(path, bytes, length, &found, err);
    if (status == BAL_OK) {
        status = bali_xml_create_take(strcmp(path, "-") == 0 ? bali_base_name(path) : path, bytes, length, &xml, err);
        bytes = NULL;
    }
    if (status == BAL_OK) status = bali_xmlbif_document(xml, options ? options : &defaults, out, err);
    if (status == BAL_OK && facts) *facts = found;
    bali_xml_free(xml);
    bali_free(bytes);
    return status;
}

bal_status bal_document_write(const bal_document *document, const char *path, bal_error *err) {
    char *text = NULL;
    size_t length = 0;
    bal_status status = bal_document_print(document, &text, &length, err);
    if (status == BAL_OK) status = bali_output_write_whole(path, text, length, err);
    bal_text_free(text);
    return status;
}
