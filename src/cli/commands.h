/* Every command of the program. */
#ifndef CLI_COMMANDS_H
#define CLI_COMMANDS_H

#include "cli/options.h"

extern const bali_command bali_cmd_check, bali_cmd_fit, bali_cmd_tally, bali_cmd_draw, bali_cmd_explain;

#endif
