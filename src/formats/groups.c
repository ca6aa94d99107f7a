#include "formats/groups.h"

#include "base/memory.h"
#include "base/names.h"

struct bal_groups {
    bali_names names; /* its labels are copies */
};

bal_status bal_groups_create(bal_groups **out, bal_error *err) {
    *out = bali_allocate(1, sizeof **out);
    return *out ? BAL_OK : bali_out_of_memory(err);
}

void bal_groups_free(bal_groups *groups) {
    if (!groups) return;
    for (size_t i = 0; i < groups->names.n_names; i++) bali_free((char *)groups->names.names[i]);
    bali_names_free(&groups->names);
    bali_free(groups);
}

bool bali_groups_number(bal_groups *groups, const char *label, size_t length, uint32_t *number) {
    size_t i = bali_names_find(&groups->names, label, length);
    *number = i == BALI_NO_NAME ? UINT32_MAX : (uint32_t)i;
    if (i != BALI_NO_NAME || groups->names.n_names == BALI_MOST_GROUPS) return true;
    size_t first;
    char *copy = bali_duplicate(label, length);
    if (!copy || !bali_names_add(&groups->names, copy, &first)) {
        bali_free(copy);
        return false;
    }
    *number = (uint32_t)(groups->names.n_names - 1);
    return true;
}

size_t bali_groups_count(const bal_groups *groups) {
    return groups->names.n_names;
}
