/* A family's shape, and the way between a parent configuration and its row. */
#ifndef MODEL_SHAPE_H
#define MODEL_SHAPE_H

#include "base/text.h"
#include "ballast/network.h"

/** One more hold of a network; given back by bal_network_free. */
bal_network *bali_network_hold(const bal_network *network);

/** Adds a row's configuration as it may be shown: "Smoker=yes, Age=old"; nothing for a variable without parents. */
void bali_put_configuration(bali_text *text, const bal_network *network, size_t variable, size_t row);

/** Writes a row's configuration into a buffer, cut to fit, with a NUL behind; for messages. Returns text. */
const char *bali_configuration_text(const bal_network *network, size_t variable, size_t row, char *text, size_t size);

#endif
