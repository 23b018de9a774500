// Package schedule turns cron text into times, and runs jobs at them. It is the only door to the cron library, and uses of it
// only the parser and the search for the next matching minute.
//
// A spec is five fields (minute, hour, day of month, month, day of week) or one of @hourly, @daily, @midnight, @weekly,
// @monthly, @yearly, @annually and "@every DURATION". Civil time is what a clock on the wall shows. A gap is a stretch of civil
// time that a zone skips when its clocks go forward, a fold one that it shows twice when they go back. A slot is a time at which
// a schedule wants a run; a run is one call of a job's function.
//
// Traps that are closed here: a spec with a time zone of its own makes the library panic or change zone silently; a spec that
// can never match is accepted by it; jobs in a gap are dropped and jobs in a fold run twice. A spec at fixed times runs once a
// civil day here: in a gap at the first instant after it, in a fold at the first showing. A spec for every hour runs in real
// time. "@every" counts from a fixed instant, not from the start of the process.
//
// The loop never trusts a timer with a date: timers stand still while the machine sleeps and do not see a clock that is set.
// Slots that passed meanwhile, or while the program was down or busy, are caught up by one run, whose slot is the newest of them.
package schedule
