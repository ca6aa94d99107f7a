/* The keys that every JSON result begins with. */
#include "ballast.h"
#include "report/facts.h"

static void put_inputs(bali_json *json, const bali_data_facts *data) {
    bali_json_array(json, "inputs");
    for (size_t i = 0; i < data->n_inputs; i++) {
        const bal_file_facts *file = &data->inputs[i];
        bali_json_object(json, NULL);
        bali_json_string(json, "file", file->name);
        bali_json_whole(json, "bytes", file->bytes);
        bali_json_string(json, "sha256", file->sha256[0] ? file->sha256 : NULL);
        bali_json_end_object(json);
    }
    bali_json_end_array(json);
}

static void put_network(bali_json *json, const bal_document *document, const bal_cells *pseudo_counts) {
    const bal_network *network = bal_document_network(document);
    bali_json_object(json, "network");
    bali_json_string(json, "name", bal_document_name(document));
    bali_json_whole(json, "variables", bal_network_variables(network));
    bali_json_whole(json, "arcs", bal_network_arcs(network));
    bali_json_whole(json, "cells", bal_network_cells(network));
    bali_json_whole(json, "free_parameters", bali_free_parameters(network, pseudo_counts));
    bali_json_end_object(json);
}

static void put_data(bali_json *json, const bal_document *document, const bali_data_facts *data) {
    const bal_domain *domain = bal_network_domain(bal_document_network(document));
    const bal_source_summary *summary = &data->summary;
    bali_json_object(json, "data");
    bali_json_number(json, "records", data->records);
    bali_json_number(json, "weight", data->weight);
    bali_json_number(json, "earlier", data->earlier);
    bali_json_number(json, "incomplete", (double)summary->incomplete);
    bali_json_whole(json, "dropped", summary->dropped);
    bali_json_array(json, "ignored_columns");
    for (size_t i = 0; i < summary->n_ignored; i++) bali_json_string(json, NULL, summary->ignored[i]);
    bali_json_end_array(json);
    bali_json_array(json, "missing");
    for (size_t v = 0; summary->missing && v < bal_domain_variables(domain); v++) {
        if (summary->missing[v] == 0) continue;
        bali_json_object(json, NULL);
        bali_json_string(json, "variable", bal_domain_name(domain, v));
        bali_json_whole(json, "records", summary->missing[v]);
        bali_json_end_object(json);
    }
    bali_json_end_array(json);
    bali_json_end_object(json);
}

void bali_json_ballast(bali_json *json, const char *command) {
    bali_json_object(json, "ballast");
    bali_json_string(json, "version", BALLAST_VERSION);
    bali_json_whole(json, "schema", 1);
    bali_json_string(json, "command", command);
    bali_json_end_object(json);
}

void bali_json_head(bali_json *json, const char *command, const bal_document *document, const bal_cells *pseudo_counts,
                    const bali_data_facts *data, bool has_data) {
    bali_json_ballast(json, command);
    put_inputs(json, data);
    put_network(json, document, pseudo_counts);
    if (has_data) {
        put_data(json, document, data);
    } else {
        bali_json_null(json, "data");
    }
}

void bali_draw_json(const bal_document *document, const bali_data_facts *data, uint64_t records, uint64_t seed, bali_json *json) {
    bali_json_object(json, NULL);
    bali_json_head(json, "draw", document, NULL, data, false);
    bali_json_whole(json, "records", records);
    bali_json_whole(json, "seed", seed);
    bali_json_end_object(json);
}

void bali_json_given(bali_json *json, const char *key, const bal_network *network, size_t variable, size_t row) {
    const bal_domain *domain = bal_network_domain(network);
    size_t n_parents, left = bal_network_rows(network, variable);
    const size_t *parents = bal_network_parents(network, variable, &n_parents);
    bali_json_object(json, key);
    for (size_t p = 0; p < n_parents; p++) {
        left /= bal_network_outcomes(network, parents[p]);
        bali_json_string(json, bal_domain_name(domain, parents[p]), bal_domain_outcome(domain, parents[p], row / left));
        row %= left;
    }
    bali_json_end_object(json);
}
