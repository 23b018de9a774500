// Package feed turns files into observations: it finds the files of a feed that are ready, reads one strictly as the feed
// declares it, and gives a watcher.Sheet, or a watcher.BadFile that says where the file is wrong and what cures it.
//
// A candidate is a file that is there. A record is one line, or several when a quoted cell holds newlines; a chunk is a run of
// whole records that one worker parses; a run is a row of values of consecutive series on one date. Chunks are parsed side by
// side and merged in the order of the file, so that the result never depends on the number of workers.
//
// Nothing is guessed: layout, unit, number style, date style and encoding are the feed's. The inbox is only ever read. A
// quote that is out of place refuses the file even where bad rows may be skipped, since what follows it cannot be trusted.
// Names of a refused file are forgotten again.
package feed
