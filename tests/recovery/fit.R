# Fits what the plan asks for and writes what came out as tables; decides nothing.
#
#   Rscript --vanilla fit.R plan.csv FOLDER
#
# The plan has a row for each fit: study, variant, outcome, table (a CSV with a row for each trial
# and region), region, formula, coding ("stated" for the numbers of the study file, "treatment" for
# 0 and 1), agq (nAGQ of glmer).

suppressPackageStartupMessages(library(lme4))

given <- commandArgs(trailingOnly = TRUE)
plan <- read.csv(given[1], encoding = "UTF-8")
into <- given[2]
# Forking is how R works on several things at once where it is not on Windows.
cores <- if (.Platform$OS.type == "windows") 1L else max(1L, min(2L, parallel::detectCores()))

upper_level <- c(notice = "long", crop = "unusual")

read_rows <- function(wanted) {
  rows <- read.csv(wanted$table, encoding = "UTF-8", na.strings = "")
  rows <- rows[rows$region == wanted$region, ]
  for (factor in names(upper_level)) {
    rows[[factor]] <- if (wanted$coding == "stated") {
      rows[[paste0(factor, "_contrast")]]
    } else {
      as.numeric(rows[[factor]] == upper_level[[factor]])
    }
  }
  rows[!is.na(rows[[wanted$outcome]]), ]
}

fit_one <- function(wanted) {
  rows <- read_rows(wanted)
  notes <- character()
  note <- function(condition, restart) {
    notes <<- c(notes, gsub("[\r\n]+", " ", conditionMessage(condition)))
    invokeRestart(restart)
  }
  model <- withCallingHandlers(
    glmer(as.formula(wanted$formula), rows, binomial, nAGQ = wanted$agq,
          control = glmerControl(optimizer = "bobyqa")),
    message = function(condition) note(condition, "muffleMessage"),
    warning = function(condition) note(condition, "muffleWarning")
  )
  table <- coef(summary(model))
  reach <- qnorm(0.975) * table[, "Std. Error"]
  spread <- as.data.frame(VarCorr(model))
  named <- function(...) {
    rows <- data.frame(...)
    cbind(wanted[rep(1L, nrow(rows)), c("study", "variant", "outcome")], rows, row.names = NULL)
  }
  list(
    coefficients = named(
      term = rownames(table), estimate = table[, "Estimate"],
      standard_error = table[, "Std. Error"],
      low = table[, "Estimate"] - reach, high = table[, "Estimate"] + reach
    ),
    # Uncorrelated terms of one group come as participant and participant.1.
    deviations = named(
      group = sub("\\.\\d+$", "", spread$grp), term = spread$var1,
      deviation = spread$sdcor
    ),
    fitted = named(
      participant = rows$participant, trial = rows$trial,
      value = rows[[wanted$outcome]], fitted = as.numeric(fitted(model))
    ),
    notes = named(note = notes)
  )
}

answers <- parallel::mclapply(
  split(plan, seq_len(nrow(plan))), fit_one, mc.cores = cores, mc.preschedule = TRUE
)
# What failed is a text, and nothing at all where a process was killed.
failed <- !vapply(answers, is.list, logical(1))
if (any(failed)) stop(sum(failed), " fits failed: ", unlist(answers[failed]))
for (name in names(answers[[1]])) {
  table <- do.call(rbind, lapply(answers, `[[`, name))
  write.csv(table, file.path(into, paste0(name, ".csv")), row.names = FALSE)
}
versions <- data.frame(r = paste(R.version$major, R.version$minor, sep = "."),
                       lme4 = as.character(packageVersion("lme4")))
write.csv(versions, file.path(into, "versions.csv"), row.names = FALSE)
