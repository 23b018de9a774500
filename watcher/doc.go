// Package watcher is the pass: read, gate, judge, record, tell. It declares what it needs of a source of files and of a store,
// and imports no third-party package; the technologies live in the folders below it.
//
// A pass is one run over one or all feeds. Each file that it takes becomes one visible step of the ledger: a number that
// grows by one, so that "what was known when" is a comparison of steps. Values move in columns: the returns of one date for a
// block of BlockSize series.
package watcher
