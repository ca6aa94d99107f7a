/* Variables and their outcomes. */
#ifndef MODEL_DOMAIN_H
#define MODEL_DOMAIN_H

#include "base/names.h"
#include "ballast/network.h"

/** One more hold of a domain; given back by bal_domain_free. */
bal_domain *bali_domain_hold(const bal_domain *domain);

/** All variables' names, and all labels of one variable, in order: for messages that suggest a spelling. */
const char *const *bali_domain_names(const bal_domain *domain);
const char *const *bali_domain_labels(const bal_domain *domain, size_t variable);

/** As bal_domain_find and bal_domain_find_outcome, for text without a NUL behind. */
size_t bali_domain_find(const bal_domain *domain, const char *text, size_t length);
size_t bali_domain_find_outcome(const bal_domain *domain, size_t variable, const char *text, size_t length);

/** Whether two domains have the same variables and outcomes, in the same order. */
bool bali_domain_equal(const bal_domain *a, const bal_domain *b);

#endif
