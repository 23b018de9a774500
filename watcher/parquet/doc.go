// Package parquet reads tables of the Parquet format as watcher.Grid, and writes what a ledger holds as such a table. It is the only door to
// the library.
//
// A leaf is a column of values; a row group is a run of rows, kept column by column in pages. Only flat tables are read: no lists, no
// records within records.
//
// Trap: sizes and counts in a file are claims, and the library takes room by them before it has read anything. So every page is looked at
// first (guard.go): its claim is bounded, and what it unpacks to is counted where the packing can swell without limit. What the library
// panics with on a damaged file becomes a fault of the file.
package parquet
