// Package health tells others how the daemon is: by HTTP on a loopback address, to the service manager, and by a heartbeat.
//
// A Report is how the daemon is at one moment, in plain values. A page is one answer made from it. A trouble is a sentence about
// what is not as it should be. The beat is the last sign of life of the daemon's loop.
//
// # Pages
//
//	/alive    200 while the last beat is young, else 503: whether to start the daemon anew
//	/ready    200 when the ledger is open, the configuration valid and no stop under way, else 503: whether it took up its work
//	/healthy  200 when there is no trouble, else 503 with one trouble a line: whether a person must look
//	/state    always 200: everything, as JSON
//	/metrics  always 200: figures in the OpenMetrics 1.0 text format
//
// Troubles are: not alive; not ready; a dead channel, or one whose fallback has taken over; a notice that has waited for more than 15 minutes; a job whose due slot has
// not run for more than twice its interval. A dead channel does not make the daemon unready: starting it anew would not help,
// and a script that waits for the start to succeed must not fail because the chat is down.
//
// # State
//
// The keys of /state are stable. Times are RFC 3339 in UTC, null where there is none, as are texts; counts are numbers.
//
//	version                                        of the program
//	now, started, beat                             times
//	alive, ready, healthy, stopping                true or false
//	troubles                                       array of sentences
//	ledger         {open, path, step, bytes, series}
//	configuration  {valid, hash, error, error_at}  error: of the last reload, when it was refused; the one before is in force
//	jobs           [{job, last_slot, outcome, error, next_slot, running_since, overdue, runs, failed, panics, missed, coalesced}]
//	channels       [{channel, state, reason, waiting, failed, oldest_waiting, error, fallback}]  state: ok, waiting, dead;
//	                                               fallback: the channel that has taken over
//	feeds          [{feed, file, date, at}]        the last accepted file of each
//	last_pass      {number, started, ended, error, accepted, refused, waiting, verdicts: {FINDING: n}, flags: {KIND: n}}, or null
//	open_flags     {KIND: n}                       those that still ask something of a person
//	clock_steps                                    how often the clock moved by itself
//
// # Traps
//
// Loopback is open to every user of the machine and, through a browser, to web pages: so each request must name a loopback host
// and come from no other origin, and nothing secret may be in a Report. Metrics carry labels whose values the configuration
// bounds, never a series, a file or a hash. Beat and Now keep their monotonic readings, so that a clock that is set makes nobody look dead.
package health
