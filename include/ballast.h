/* Ballast: conditional probability tables of a diagnostic network, learnt with Dirichlet priors.
 * The one header that users of the library include. */
#ifndef BALLAST_H
#define BALLAST_H

#include "ballast/error.h"
#include "ballast/fit.h"
#include "ballast/formats.h"
#include "ballast/infer.h"
#include "ballast/judge.h"
#include "ballast/network.h"
#include "ballast/posterior.h"
#include "ballast/prior.h"
#include "ballast/score.h"
#include "ballast/table.h"
#include "ballast/tally.h"

#define BALLAST_VERSION "0.1.0"

#endif
