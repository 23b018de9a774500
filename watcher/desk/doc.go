// Package desk is the control socket: commands beside a running daemon go through it, so that one process holds the ledger and
// every command gives the same answers with and without a daemon.
//
// A call is one command line. The server carries it out, keeps its output until it has ended, and sends output and exit code;
// so a slow reader never holds a reading of the ledger open. Who calls is the socket's peer, never what the call says.
//
// The socket lies in a folder that only its owner may enter, under a short hash of the ledger's path. A stale socket of a
// process that was killed is removed by the next daemon, which proves by the ledger's lock that it is the only one.
package desk
