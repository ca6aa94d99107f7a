# The fit of two tables of R's datasets package in R base alone: counts by table(), scores by lgamma(), intervals by qbeta().
#
# usage: Rscript fit_in_r.R FOLDER
# Writes the records of each table to FOLDER/NAME.csv, and to standard output one line a quantity:
# table, prior, family, quantity, numbers; cells with the outcomes fastest and the first parent slowest.

structures <- list(
  titanic = list(data = Titanic, parents = list(
    Class = character(0), Sex = "Class", Age = c("Class", "Sex"), Survived = c("Class", "Sex", "Age"))),
  ucbadmissions = list(data = UCBAdmissions, parents = list(
    Gender = character(0), Dept = "Gender", Admit = c("Gender", "Dept"))))

priors <- list(
  k2 = function(q, r) 1,
  jeffreys = function(q, r) 1 / 2,
  "bdeu-10" = function(q, r) 10 / (q * r))

say <- function(..., numbers) cat(..., sprintf("%.17g", numbers), "\n")

fit_family <- function(table_name, prior_name, variable, n) {
  q <- ncol(n)
  r <- nrow(n)
  alpha <- priors[[prior_name]](q, r)
  total <- colSums(n)
  rest <- rep(total + (r - 1) * alpha, each = r) - n
  say(table_name, prior_name, variable, "counts", numbers = n)
  say(table_name, prior_name, variable, "mean", numbers = (alpha + n) / rep(total + r * alpha, each = r))
  say(table_name, prior_name, variable, "low", numbers = qbeta(0.025, alpha + n, rest))
  say(table_name, prior_name, variable, "high", numbers = qbeta(0.975, alpha + n, rest))
  say(table_name, prior_name, variable, "log_marginal_likelihood", numbers =
    sum(lgamma(alpha + n) - lgamma(alpha)) - sum(lgamma(r * alpha + total) - lgamma(r * alpha)))
}

folder <- commandArgs(trailingOnly = TRUE)[1]
for (table_name in names(structures)) {
  counts <- as.data.frame(structures[[table_name]]$data, stringsAsFactors = TRUE)
  records <- counts[rep(seq_len(nrow(counts)), counts$Freq), names(counts) != "Freq"]
  write.csv(records, file.path(folder, paste0(table_name, ".csv")), row.names = FALSE)
  parents <- structures[[table_name]]$parents
  for (variable in names(parents)) {
    n <- table(records[c(variable, rev(parents[[variable]]))])
    n <- matrix(n, nrow = dim(n)[1])
    for (prior_name in names(priors)) fit_family(table_name, prior_name, variable, n)
  }
}
