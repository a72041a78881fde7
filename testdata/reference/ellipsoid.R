# Reads points, one "x y z" a line, from standard input, and writes the
# ellipsoid of least volume around them by R's package cluster: its volume, its
# centre and its squared semi-axes, descending.
suppressPackageStartupMessages(library(cluster))
x <- as.matrix(read.table(file("stdin")))
e <- ellipsoidhull(x, tol = 1e-9, maxit = 1000000)
cat(sprintf("%.17g", c(volume(e), e$loc, e$d2 * eigen(e$cov)$values)), "\n")
