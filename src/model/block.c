#include "model/block.h"

#include "base/memory.h"
#include "model/domain.h"

void bali_source_init(bal_source *source, const bali_source_methods *methods, const bal_domain *domain) {
    source->methods = methods;
    source->domain = bali_domain_hold(domain);
}

unsigned bali_code_width(const bal_domain *domain) {
    for (size_t v = 0; v < bal_domain_variables(domain); v++)
        if (bal_domain_outcomes(domain, v) > 254) return 2;
    return 1;
}

const bal_domain *bal_source_domain(const bal_source *source) {
    return source->domain;
}

bal_status bal_source_next(bal_source *source, bal_block *block, bal_error *err) {
    *block = (bal_block){0};
    return source->methods->next(source, block, err);
}

bal_status bal_source_rewind(bal_source *source, bal_error *err) {
    return source->methods->rewind(source, err);
}

void bal_source_locate(bal_source *source, uint64_t place, bal_error *err) {
    if (!err) return;
    if (source->methods->locate) source->methods->locate(source, place, err);
    else bal_error_context(err, (size_t)place + 1, NULL);
}

void bal_source_summary_get(const bal_source *source, bal_source_summary *out) {
    *out = (bal_source_summary){0};
    if (source->methods->summary) source->methods->summary(source, out);
}

void bal_source_free(bal_source *source) {
    if (!source) return;
    bal_domain *domain = source->domain;
    source->methods->free(source);
    bal_domain_free(domain);
}
