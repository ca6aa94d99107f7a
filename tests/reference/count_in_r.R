# Counts of oddly formatted tables by R base: read.csv() and table().
#
# usage: Rscript count_in_r.R FOLDER
# FOLDER/list.tsv names a table a line: file, delimiter, weight column or "-". Every table has the columns A and B; their labels
# stand in FOLDER/labels.tsv, "A" or "B" and a label a line. To standard output a line a table: its name and the counts of A and of B given A.

folder <- commandArgs(trailingOnly = TRUE)[1]
labels <- read.delim(file.path(folder, "labels.tsv"), header = FALSE, quote = "", colClasses = "character", encoding = "UTF-8")
tables <- read.delim(file.path(folder, "list.tsv"), header = FALSE, quote = "", colClasses = "character")
delimiters <- c(comma = ",", semicolon = ";", tab = "\t")
for (i in seq_len(nrow(tables))) {
  records <- read.csv(file.path(folder, tables[i, 1]), sep = delimiters[[tables[i, 2]]], colClasses = "character", strip.white = TRUE,
                      na.strings = character(0), check.names = FALSE, fileEncoding = "UTF-8-BOM", comment.char = "")
  a <- factor(records$A, levels = labels[labels[, 1] == "A", 2])
  b <- factor(records$B, levels = labels[labels[, 1] == "B", 2])
  stopifnot(!anyNA(a), !anyNA(b))
  weight <- if (tables[i, 3] == "-") rep(1, nrow(records)) else as.numeric(records[[tables[i, 3]]])
  of_a <- xtabs(weight ~ a)
  of_b <- xtabs(weight ~ b + a) # outcomes of B fastest
  cat(tables[i, 1], sprintf("%.17g", c(of_a, of_b)), "\n")
}
