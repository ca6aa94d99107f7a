/* Words that several pages share. */
#ifndef REPORT_WORDS_H
#define REPORT_WORDS_H

#include "report/facts.h"

enum { BALI_LABEL_WIDTH = 10 };

/** A name or label as it may be shown on a terminal. */
void bali_put_visible(bali_text *text, const char *string);

/** A count of records with commas between thousands; one decimal where it is a mean over repeats that is not whole. */
void bali_put_records(bali_text *text, double records);

/** "1 arc", "2 arcs". */
void bali_put_number_of(bali_text *text, size_t n, const char *what);

/** "12 variables, 16 arcs, 56 rows, 134 cells, 78 free parameters". */
void bali_put_shape(bali_text *text, const bal_network *network, size_t free_parameters);

/** A labelled paragraph: the label in its own column, the words beside it. Empties the words. */
void bali_put_item(bali_text *text, const char *label, bali_text *words);

/** "cases.csv", "jan.csv and 2 more tables", "the network's own counts". */
void bali_put_data_source(bali_text *words, const bali_data_facts *data);

/** A title and up to most (at most 8) rows that rest on this basis, and how many more there are; nothing when there is none. */
void bali_put_row_list(bali_text *text, const bal_cells *counts, bal_basis basis, size_t most, const char *title);

/** What was held out and how ML compares; nothing when nothing was. */
void bali_put_heldout(bali_text *text, const bali_fit_facts *facts);

#endif
