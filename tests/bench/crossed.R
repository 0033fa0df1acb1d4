# One straight line of log sensitivity over exposure, probes' levels and slopes and the days' effects random:
#   Rscript crossed.R readings.csv ROUNDS
# Prints the seconds of each fit, the first one (which compiles and loads) left out.
suppressMessages(library(lme4))
given <- commandArgs(trailingOnly = TRUE)
readings <- read.csv(given[1])
for (round in 0:as.integer(given[2])) {
  taken <- system.time(lmer(y ~ hours + (1 + hours | unit) + (1 | day), data = readings))[["elapsed"]]
  if (round > 0) cat(taken, "\n")
}
