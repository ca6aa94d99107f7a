#include "cli/twice.h"

#include "base/files.h"
#include "cli/provenance.h"

#include <string.h>

bal_status bali_refuse_same_files(const bali_call *call, bal_error *err) {
    const option_value *test = &call->values[OPTION_TEST];
    for (size_t i = 1; i < call->n_arguments; i++) {
        const char *path = call->arguments[i];
        if (test->given && bali_same_file(test->text, path))
            return bal_error_set(err, BAL_ERR_ARGUMENT, "input-twice",
                                 "%s would be fitted to and held out as well; give --test a table of other records", test->text);
        for (size_t k = 1; k < i; k++)
            if (strcmp(path, "-") != 0 && bali_same_file(path, call->arguments[k]))
                return bal_error_set(err, BAL_ERR_ARGUMENT, "input-twice", "%s stands twice among the data, and its records would count twice; name it once",
                                     path);
    }
    return BAL_OK;
}

static bool equal_bytes(const bal_file_facts *a, const bal_file_facts *b) {
    return a->sha256[0] && strcmp(a->sha256, b->sha256) == 0;
}

static void warn(const bali_inputs *inputs, const char *file, bal_error *notice) {
    notice->status = BAL_OK;
    bal_error_place(notice, file, 0, 0);
    inputs->notices.tell(inputs->notices.context, BAL_WARNING, notice);
}

void bali_warn_of_equal_tables(const bali_inputs *inputs) {
    const bal_file_facts *data = inputs->facts.inputs + inputs->facts.first_data;
    for (size_t i = 1; i < inputs->facts.n_data; i++)
        for (size_t k = 0; k < i; k++) {
            if (!equal_bytes(&data[i], &data[k])) continue;
            bal_error notice = {0};
            (void)bal_error_set(&notice, BAL_ERR_DATA, "same-content",
                                "holds the same bytes as %s, so its records count twice, and each may be held out while its copy is not; leave one "
                                "of them out",
                                data[k].name);
            warn(inputs, data[i].name, &notice);
            break;
        }
}

bal_status bali_refuse_equal_test(const bali_inputs *inputs, const bal_file_facts *test, bal_error *err) {
    for (size_t i = 0; i < inputs->facts.n_data && inputs->facts.records > 0; i++) /* two empty tables share nothing */
        if (equal_bytes(test, &inputs->facts.inputs[inputs->facts.first_data + i]))
            return bal_error_set(err, BAL_ERR_DATA, "input-twice",
                                 "%s holds the same bytes as %s, which is fitted to; give --test a table of other records", test->name,
                                 inputs->facts.inputs[inputs->facts.first_data + i].name);
    return BAL_OK;
}

bal_status bali_warn_of_known_part(const bali_inputs *inputs, bal_error *err) {
    const char *parts = bal_document_property(inputs->document, BAL_OF_NETWORK, BAL_NONE, "ballast.parts");
    if (!parts || inputs->facts.n_data == 0) return BAL_OK;
    bali_text hash = {0};
    bal_status status = bali_put_counts_hash(inputs->counts, &hash, err);
    if (status == BAL_OK && strstr(parts, bali_text_string(&hash))) {
        bal_error notice = {0};
        (void)bal_error_set(&notice, BAL_ERR_DATA, "part-twice",
                            "the same counts went into this file before: the same records may count twice now; check that they are other cases");
        warn(inputs, inputs->facts.inputs[0].name, &notice);
    }
    bali_text_free(&hash);
    return status;
}
