package health

import "time"

// families lists the metrics in the order of the page. Counters begin anew with each start.
func families() []family {
	all := daemonFamilies()
	all = append(all, jobFamilies()...)
	all = append(all, channelFamilies()...)
	return append(all, passFamilies()...)
}

func daemonFamilies() []family {
	return []family{
		{"strayd_build", "info", "", "the program", func(l *look) []sample { return []sample{{"version", l.Version, 1}} }},
		{"strayd_start_timestamp_seconds", "gauge", "seconds", "when the daemon started", at(func(l *look) time.Time { return l.Started })},
		{"strayd_beat_timestamp_seconds", "gauge", "seconds", "last sign of life of the loop", at(func(l *look) time.Time { return l.Beat })},
		{"strayd_alive", "gauge", "", "1 when the last beat is young", one(func(l *look) float64 { return yes(l.alive) })},
		{"strayd_ready", "gauge", "", "1 when ledger and configuration are in order and no stop is under way", one(func(l *look) float64 { return yes(l.ready()) })},
		{"strayd_healthy", "gauge", "", "1 when nobody must look", one(func(l *look) float64 { return yes(l.healthy()) })},
		{"strayd_reload_refused", "gauge", "", "1 while the last reload was refused and the configuration before it is in force", one(func(l *look) float64 { return yes(l.Configuration.Error != "") })},
		{"strayd_ledger_step", "gauge", "", "newest step of the ledger", one(func(l *look) float64 { return float64(l.Ledger.Step) })},
		{"strayd_ledger_size_bytes", "gauge", "bytes", "size of the ledger's file", one(func(l *look) float64 { return float64(l.Ledger.Bytes) })},
		{"strayd_ledger_series", "gauge", "", "series in the ledger", one(func(l *look) float64 { return float64(l.Ledger.Series) })},
		{"strayd_clock_steps", "counter", "", "how often the clock moved by itself", one(func(l *look) float64 { return float64(l.ClockSteps) })},
		{"strayd_open_flags", "gauge", "", "flags that still ask something of a person", openFlags},
	}
}

func jobFamilies() []family {
	return []family{
		{"strayd_job_runs", "counter", "", "runs of a job", jobs(func(_ *look, j *Job) float64 { return float64(j.Runs) })},
		{"strayd_job_failed", "counter", "", "runs that failed", jobs(func(_ *look, j *Job) float64 { return float64(j.Failed) })},
		{"strayd_job_panics", "counter", "", "failed runs that ended in a panic", jobs(func(_ *look, j *Job) float64 { return float64(j.Panics) })},
		{"strayd_job_missed", "counter", "", "slots that a later slot's run caught up with", jobs(func(_ *look, j *Job) float64 { return float64(j.Missed) })},
		{"strayd_job_coalesced", "counter", "", "requests that one run served together", jobs(func(_ *look, j *Job) float64 { return float64(j.Coalesced) })},
		{"strayd_job_running", "gauge", "", "1 while the job runs", jobs(func(_ *look, j *Job) float64 { return yes(!j.Running.IsZero()) })},
		{"strayd_job_overdue", "gauge", "", "1 when a due slot has waited for more than twice the interval", jobs(func(l *look, j *Job) float64 { return yes(j.overdue(l.Now)) })},
		{"strayd_job_last_slot_timestamp_seconds", "gauge", "seconds", "last slot that is done with", jobTimes(func(j *Job) time.Time { return j.LastSlot })},
		{"strayd_job_next_slot_timestamp_seconds", "gauge", "seconds", "first slot that has not run", jobTimes(func(j *Job) time.Time { return j.NextSlot })},
	}
}

func channelFamilies() []family {
	return []family{
		{"strayd_channel_dead", "gauge", "", "1 when the channel does not try again by itself", channels(func(_ *look, c *Channel) float64 { return yes(c.State == ChannelDead) })},
		{"strayd_channel_waiting_notices", "gauge", "", "notices to be sent", channels(func(_ *look, c *Channel) float64 { return float64(c.Waiting) })},
		{"strayd_channel_failed_notices", "gauge", "", "notices that failed for good", channels(func(_ *look, c *Channel) float64 { return float64(c.Failed) })},
		{"strayd_channel_oldest_waiting_seconds", "gauge", "seconds", "how long the oldest notice has waited", channels(func(l *look, c *Channel) float64 { return c.age(l.Now).Seconds() })},
	}
}

func passFamilies() []family {
	return []family{
		{"strayd_feed_accepted_timestamp_seconds", "gauge", "seconds", "when the last file of a feed was accepted", feedTimes},
		{"strayd_pass_number", "gauge", "", "number of the last pass", one(func(l *look) float64 { return float64(l.Pass.Number) })},
		{"strayd_pass_started_timestamp_seconds", "gauge", "seconds", "when the last pass began", at(func(l *look) time.Time { return l.Pass.Started })},
		{"strayd_pass_ended_timestamp_seconds", "gauge", "seconds", "when the last pass ended", at(func(l *look) time.Time { return l.Pass.Ended })},
		{"strayd_pass_files", "gauge", "", "files of the last pass", passFiles},
		{"strayd_pass_verdicts", "gauge", "", "verdicts of the last pass", passVerdicts},
		{"strayd_pass_flags", "gauge", "", "flags that the last pass raised", passFlags},
	}
}
