#include "cli/prior_options.h"

/* Which priors an option goes with. */
static const struct {
    option_id option;
    bool with[BAL_PRIOR_KINDS]; /* bdeu, k2, jeffreys, expert, carried */
    const char *goes_with;
} rules[] = {
    {OPTION_ESS, {true, false, false, false, false}, "bdeu"},
    {OPTION_SCALE, {false, true, true, true, false}, "k2, jeffreys and expert"},
    {OPTION_ROW_ESS, {false, false, false, true, false}, "expert"},
    {OPTION_PRIOR_FLOOR, {false, false, false, true, false}, "expert"},
    {OPTION_CARRY, {false, false, false, false, true}, "carried"},
};

static bal_status check_rules(const bali_call *call, bal_prior_kind kind, bal_error *err) {
    for (size_t i = 0; i < sizeof rules / sizeof rules[0]; i++) {
        if (!call->values[rules[i].option].given || rules[i].with[kind]) continue;
        return bal_error_set(err, BAL_ERR_ARGUMENT, "option-mismatch", "--%s goes with --prior %s, not with %s; leave one of them out",
                             bali_option_table()[rules[i].option].name, rules[i].goes_with, bal_prior_kind_name(kind));
    }
    return BAL_OK;
}

static void read_strength(const option_value *value, bal_prior_options *options) {
    if (value->word < 0) {
        options->choice = BAL_STRENGTH_GIVEN;
        options->strength = value->number;
    } else {
        options->choice = value->word == 0 ? BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD : BAL_STRENGTH_BY_LEAVE_ONE_OUT;
        options->strength = 1;
    }
}

bal_status bali_prior_options_read(const bali_call *call, bal_prior_options *options, bal_error *err) {
    *options = bal_prior_options_defaults();
    options->kind = (bal_prior_kind)call->values[OPTION_PRIOR].word;
    bal_status status = check_rules(call, options->kind, err);
    if (status != BAL_OK) return status;
    read_strength(&call->values[options->kind == BAL_PRIOR_BDEU ? OPTION_ESS : OPTION_SCALE], options);
    options->row_ess = call->values[OPTION_ROW_ESS].number;
    options->floor = call->values[OPTION_PRIOR_FLOOR].number;
    return BAL_OK;
}
