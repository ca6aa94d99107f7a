/* Data that would go in twice: one file by two names, equal files, counts that a carried fit has already. */
#ifndef CLI_TWICE_H
#define CLI_TWICE_H

#include "cli/inputs.h"

/** Fails: ARGUMENT "input-twice" when one file is named twice among the data and the test table. */
BAL_MUST_CHECK bal_status bali_refuse_same_files(const bali_call *call, bal_error *err);

/** Warns of tables among the data whose bytes are the same (known up to the size that is hashed). */
void bali_warn_of_equal_tables(const bali_inputs *inputs);

/** Fails: DATA "input-twice" when a test table has the bytes of one of the tables fitted to. */
BAL_MUST_CHECK bal_status bali_refuse_equal_test(const bali_inputs *inputs, const bal_file_facts *test, bal_error *err);

/** Warns when the counts of the data are a part of the carried fit already. Fails: MEMORY. */
BAL_MUST_CHECK bal_status bali_warn_of_known_part(const bali_inputs *inputs, bal_error *err);

#endif
