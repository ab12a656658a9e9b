# Reads the tables of a folder with nothing but the codebook and what its page says, writes every
# value back for comparison, and shows the structure that R sees.
#
#   Rscript codebook_types.R FOLDER INTO MARKED TABLE...

arguments <- commandArgs(trailingOnly = TRUE)
folder <- arguments[1]
into <- arguments[2]
marked <- paste(readLines(arguments[3], encoding = "UTF-8", warn = FALSE), collapse = "\n")
tables <- arguments[-(1:3)]

plain <- function(texts) {
  quoted <- startsWith(texts, "'") & grepl(marked, texts, perl = TRUE)
  quoted[is.na(quoted)] <- FALSE
  texts[quoted] <- substring(texts[quoted], 2)
  texts
}

read_texts <- function(path) {
  table <- read.csv(path, colClasses = "character", na.strings = "", check.names = FALSE,
                    encoding = "UTF-8")
  names(table) <- plain(names(table))
  table[] <- lapply(table, plain)
  table
}

levels_in <- function(cell) {
  gsub("\\\\([\\\\|])", "\\1", strsplit(cell, " | ", fixed = TRUE)[[1]])
}

codebook <- read_texts(file.path(folder, "codebook.csv"))
columns <- codebook[!(codebook$table == "outcomes" & !is.na(codebook$outcome)), ]
classes <- c(text = "character", category = "character", flag = "integer", integer = "integer",
             number = "numeric")

for (name in tables) {
  own <- columns[columns$table == name, ]
  table <- read.csv(file.path(folder, paste0(name, ".csv")), na.strings = "", check.names = FALSE,
                    encoding = "UTF-8", colClasses = unname(classes[own$type]))
  names(table) <- plain(names(table))
  stopifnot(identical(names(table), own$column))
  for (place in seq_along(table)) {
    if (own$type[place] %in% c("text", "category")) table[[place]] <- plain(table[[place]])
    if (own$type[place] == "category") {
      levels <- if (is.na(own$levels[place])) character() else levels_in(own$levels[place])
      table[[place]] <- factor(table[[place]], levels = levels)
    }
  }
  structure <- capture.output(str(table, vec.len = 1, list.len = 999))
  writeLines(structure, file.path(into, paste0(name, ".str")), useBytes = TRUE)
  exact <- lapply(table, function(column) {
    if (is.factor(column) || is.character(column)) return(as.character(column))
    ifelse(is.na(column), NA, sprintf(if (is.double(column)) "%.17g" else "%d", column))
  })
  exact <- as.data.frame(exact, check.names = FALSE, stringsAsFactors = FALSE)
  write.csv(exact, file.path(into, paste0(name, ".csv")), na = "", row.names = FALSE,
            fileEncoding = "UTF-8")
}
