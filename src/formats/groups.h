/* The labels of a fold column as numbers. */
#ifndef FORMATS_GROUPS_H
#define FORMATS_GROUPS_H

#include "ballast/formats.h"

#define BALI_MOST_GROUPS ((size_t)1 << 20)

/** The number of a label, a new one where it was not met yet. *number is UINT32_MAX when that would be beyond BALI_MOST_GROUPS.
 *  Returns false when there is no memory. */
bool bali_groups_number(bal_groups *groups, const char *label, size_t length, uint32_t *number);
/** How many labels there are. */
size_t bali_groups_count(const bal_groups *groups);

#endif
