#include "model/shape.h"

#include <string.h>

void bal_network_configuration(const bal_network *network, size_t variable, size_t row, size_t *outcomes) {
    size_t n_parents;
    const size_t *parents = bal_network_parents(network, variable, &n_parents);
    for (size_t p = n_parents; p-- > 0;) {
        size_t r = bal_network_outcomes(network, parents[p]);
        outcomes[p] = row % r;
        row /= r;
    }
}

size_t bal_network_row(const bal_network *network, size_t variable, const size_t *outcomes) {
    size_t n_parents, row = 0;
    const size_t *parents = bal_network_parents(network, variable, &n_parents);
    for (size_t p = 0; p < n_parents; p++) row = row * bal_network_outcomes(network, parents[p]) + outcomes[p];
    return row;
}

/* The outcome of parent p in a row, without a place to put all of them. */
static size_t parent_outcome(const bal_network *network, size_t variable, size_t row, size_t p) {
    size_t n_parents;
    const size_t *parents = bal_network_parents(network, variable, &n_parents);
    for (size_t later = n_parents - 1; later > p; later--) row /= bal_network_outcomes(network, parents[later]);
    return row % bal_network_outcomes(network, parents[p]);
}

void bali_put_configuration(bali_text *text, const bal_network *network, size_t variable, size_t row) {
    const bal_domain *domain = bal_network_domain(network);
    size_t n_parents;
    const size_t *parents = bal_network_parents(network, variable, &n_parents);
    for (size_t p = 0; p < n_parents; p++) {
        const char *name = bal_domain_name(domain, parents[p]);
        const char *label = bal_domain_outcome(domain, parents[p], parent_outcome(network, variable, row, p));
        if (p > 0) bali_text_puts(text, ", ");
        bali_text_put_visible(text, name, strlen(name));
        bali_text_putc(text, '=');
        bali_text_put_visible(text, label, strlen(label));
    }
}

/* Adds text to a buffer, cut at a character's end; returns where the next goes: nowhere behind a cut. */
static size_t append(char *to, size_t size, size_t at, const char *text) {
    size_t length = strlen(text), kept = length;
    if (length > size - 1 - at) {
        kept = size - 1 - at;
        while (kept > 0 && ((unsigned char)text[kept] & 0xC0) == 0x80) kept--;
    }
    memcpy(to + at, text, kept);
    to[at + kept] = '\0';
    return kept < length ? size - 1 : at + length;
}

const char *bali_configuration_text(const bal_network *network, size_t variable, size_t row, char *text, size_t size) {
    const bal_domain *domain = bal_network_domain(network);
    size_t n_parents, at = 0;
    const size_t *parents = bal_network_parents(network, variable, &n_parents);
    text[0] = '\0';
    for (size_t p = 0; p < n_parents; p++) {
        if (p > 0) at = append(text, size, at, ", ");
        at = append(text, size, at, bal_domain_name(domain, parents[p]));
        at = append(text, size, at, "=");
        at = append(text, size, at, bal_domain_outcome(domain, parents[p], parent_outcome(network, variable, row, p)));
    }
    return text;
}
