package schedule

import "time"

// Status is how a job stands.
type Status struct {
	Job       string
	Spec      string
	Last      time.Time // up to here the slots are done with: the last one that ran, or when the job was first seen
	Next      time.Time // first slot that has not run; in the past when it waits
	Began     time.Time // of the run in progress; zero when there is none
	Waiting   bool      // a run was asked for and has not begun
	Ended     time.Time // of the last run since the start
	Outcome   Outcome   // of the last run since the start
	Error     string    // of the last run, "" when it succeeded
	Runs      int       // since the start, like all counts
	Failed    int       // of the runs: with an error or a panic
	Panics    int       // of the failed ones
	Missed    int       // slots without a run of their own, because a later slot's run caught up with them
	Coalesced int       // times that a run was asked for while one was waiting, or that a due slot served
}

// Status tells how each job stands, in the order of the jobs.
func (l *Loop) Status() []Status {
	l.mu.Lock()
	defer l.mu.Unlock()
	all := make([]Status, len(l.jobs))
	for i, s := range l.jobs {
		all[i] = s.status()
	}
	return all
}

// Steps is how often, since the start, the clock moved by more than an hour by itself.
func (l *Loop) Steps() int {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.steps
}

func (s *state) status() Status {
	st := Status{Job: s.Name, Spec: s.When.String(), Last: s.upto, Next: s.next(), Began: s.began, Waiting: s.asked != nil,
		Ended: s.ended, Outcome: s.outcome, Runs: s.runs, Failed: s.failed, Panics: s.panics, Missed: s.missed, Coalesced: s.coalesced}
	if s.err != nil {
		st.Error = s.err.Error()
	}
	return st
}
