package main

import (
	"context"
	"fmt"
	"io"
	"log/slog"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"testing/synctest"
	"time"

	"strayd/config"
	"strayd/notify"
	"strayd/rules"
	"strayd/watcher/ledger"
	"strayd/watcher/schedule"
)

// month is the daemon without its sockets, on the clock of a bubble, with the ledger in earnest and channels that only remember.
type month struct {
	*folder
	d       *daemon
	boxes   map[string]*box
	offset  atomic.Int64 // of the schedule's clock
	stop    context.CancelFunc
	running sync.WaitGroup
	runs    map[string]int // of the jobs, over all starts
	missed  map[string]int
	steps   int
}

// box is a channel that remembers first lines.
type box struct {
	mu   sync.Mutex
	dead bool
	got  []string
}

// Post takes a notice unless the channel is dead.
func (b *box) Post(_ context.Context, n rules.Notice) (string, error) {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.dead {
		return "", &notify.Failure{Class: notify.DeadChannel, Reason: "channel_not_found"}
	}
	b.got = append(b.got, time.Now().Format("02 15:04 ")+n.Lines[0])
	return "here", nil
}

func (b *box) count(part string) (n int) {
	for _, line := range b.got {
		if strings.Contains(line, part) {
			n++
		}
	}
	return n
}

const monthConfig = `feeds:
  - {name: book, files: inbox/*.csv, unit: fraction, schedule: "0 17-20 * * mon-fri", due: {at: "19:30"}}
ranges:
  - {name: own, window: 20}
channels:
  - {name: desk, console: {}}
  - {name: ops, console: {}}
`

// January 2000, in which bubbles begin: 21 days from Monday to Friday, the first of them the 3rd. Every day's file comes at 16:50, that of
// the 12th at 19:40, that of the 26th a day late. A fund strays on the 5th, 13th, 20th and 27th. No daemon runs from Monday 17, 18:30, to
// Wednesday 19, 18:30. On the 24th the clock goes 90 minutes ahead from 12:00 to 15:50. The desk's channel is dead from the 20th to
// noon on the 22nd.
func TestDaemonMonth(t *testing.T) {
	socketFolder(t)
	f := deskFolder(t)
	f.configure(monthConfig)
	synctest.Test(t, func(t *testing.T) {
		m := &month{folder: &folder{t, f.path}, boxes: map[string]*box{"desk": {}, "ops": {}}, runs: map[string]int{}, missed: map[string]int{}}
		m.history()
		m.start()
		for day := 3; day <= 31; day++ {
			m.day(day)
		}
		m.until(31, 23, 59)
		m.end()
		m.figures()
		m.must("ledger", "verify")
	})
}

func (m *month) until(day, hour, minute int) {
	time.Sleep(time.Until(time.Date(2000, 1, day, hour, minute, 0, 0, time.UTC)))
	synctest.Wait()
}

// file delivers the values of a date, as a sender would now.
func (m *month) file(date time.Time, stray bool) {
	var s strings.Builder
	s.WriteString("date,series,return\n")
	for i, name := range []string{"alder", "birch", "cedar"} {
		v := float64((date.YearDay()*7+i*3)%11-5) / 1000
		if stray && i == 1 {
			v = 0.2
		}
		fmt.Fprintf(&s, "%s,%s,%g\n", date.Format(time.DateOnly), name, v)
	}
	m.put(date.Format(time.DateOnly)+".csv", s.String())
}

func (m *month) put(name, text string) {
	m.write("inbox/"+name, text)
	if now := time.Now(); os.Chtimes(filepath.Join(m.path, "inbox", name), now, now) != nil {
		m.t.Fatal("the file keeps its time")
	}
}

func (m *month) history() {
	text := "date,series,return\n"
	for n := range 60 {
		date := time.Date(1999, 10, 11+n/5*7+n%5, 0, 0, 0, 0, time.UTC)
		for i, name := range []string{"alder", "birch", "cedar"} {
			text += fmt.Sprintf("%s,%s,%g\n", date.Format(time.DateOnly), name, float64((n*7+i*3)%11-5)/1000)
		}
	}
	m.put("history.csv", text)
	m.must("pass", "--settled")
}

// day lets one day happen.
func (m *month) day(day int) {
	date := time.Date(2000, 1, day, 0, 0, 0, 0, time.UTC)
	switch day {
	case 20:
		m.until(day, 0, 0)
		m.box("desk", true)
	case 22:
		m.until(day, 12, 0)
		m.box("desk", false)
		m.reload()
	case 24:
		m.until(day, 12, 0)
		m.offset.Store(int64(90 * time.Minute))
		m.until(day, 15, 50)
		m.offset.Store(0)
	case 27:
		m.until(day, 10, 0)
		m.file(date.AddDate(0, 0, -1), false)
	}
	if w := date.Weekday(); w == time.Saturday || w == time.Sunday || day == 26 {
		return
	}
	if day == 12 {
		m.until(day, 19, 40)
	} else {
		m.until(day, 16, 50)
	}
	m.file(date, day == 5 || day == 13 || day == 20 || day == 27)
	switch day {
	case 17:
		m.until(day, 18, 30)
		m.end()
	case 19:
		m.until(day, 18, 30)
		m.start()
	}
}

func (m *month) box(name string, dead bool) {
	b := m.boxes[name]
	b.mu.Lock()
	defer b.mu.Unlock()
	b.dead = dead
}

// start starts the daemon's loop and channels.
func (m *month) start() {
	m.t.Helper()
	c, err := config.Load(filepath.Join(m.path, "strayd.yaml"), configOptions())
	if err != nil {
		m.t.Fatal(err)
	}
	l, err := openLedger(c, ledger.ReadWrite)
	if err != nil {
		m.t.Fatal(err)
	}
	m.d = &daemon{log: slog.New(slog.DiscardHandler), ledger: l, started: time.Now(), program: &app{ctx: context.Background(), out: io.Discard, err: io.Discard},
		heart: make(chan struct{}, 1), passing: make(chan struct{}, 1)}
	m.d.beats.begun = make(chan struct{})
	s := m.setup(c)
	if err := m.d.beginDeadlines(c); err != nil {
		m.t.Fatal(err)
	}
	m.d.loop = &schedule.Loop{Jobs: s.jobs, Slots: l, Beat: m.d.beats.beat, Panicked: m.d.panicked,
		Now: func() time.Time { return time.Now().Add(time.Duration(m.offset.Load())) }}
	m.d.install(s)
	ctx, stop := context.WithCancel(context.Background())
	m.stop = stop
	m.running.Go(func() {
		if err := m.d.loop.Run(ctx); err != nil {
			m.t.Error(err)
		}
	})
}

// setup is that of the daemon with the boxes in the place of its channels.
func (m *month) setup(c *config.Config) *setup {
	m.t.Helper()
	s, err := m.d.prepare(c)
	if err != nil {
		m.t.Fatal(err)
	}
	sending := notify.Sending{Outbox: m.d.ledger, Report: m.d.delivered}
	for _, ch := range c.Channels {
		sending.Routes = append(sending.Routes, notify.Route{Name: ch.Name, To: m.boxes[ch.Name]})
	}
	s.post.sender = notify.NewSender(sending)
	return s
}

// reload puts the same configuration in force anew.
func (m *month) reload() {
	m.t.Helper()
	release, err := m.d.alone(context.Background())
	if err != nil {
		m.t.Fatal(err)
	}
	defer release()
	m.d.install(m.setup(m.d.inForce().config))
}

// end stops the daemon and adds up its figures.
func (m *month) end() {
	m.t.Helper()
	m.stop()
	m.running.Wait()
	m.d.inForce().post.Finish(drainMost)
	for _, s := range m.d.loop.Status() {
		m.runs[s.Job] += s.Runs
		m.missed[s.Job] += s.Missed
		if s.Failed > 0 {
			m.t.Errorf("job %s failed %d times: %s", s.Job, s.Failed, s.Error)
		}
	}
	m.steps += m.d.loop.Steps()
	if err := m.d.ledger.Close(); err != nil {
		m.t.Error(err)
	}
}

// figures holds what happened against the calendar.
func (m *month) figures() {
	equal := func(what string, have, want int) {
		m.t.Helper()
		if have != want {
			m.t.Errorf("%s: %d, want %d", what, have, want)
		}
	}
	// 21 days of 4 slots; of those, 2 on the 17th, 4 on the 18th and 2 on the 19th passed while down: one run for 8.
	equal("runs of the feed", m.runs[feedJob+"book"], 84-8+1)
	equal("missed slots of the feed", m.missed[feedJob+"book"], 7)
	equal("runs of the deadline", m.runs[deadlineJob+"book"], 21-1) // one for the 17th and the 18th
	equal("daily runs", m.runs[dailyJob], 21-1)
	equal("steps of the clock", m.steps, 2)
	kinds := map[string]int{}
	for _, f := range m.list("flags", "--all") {
		kinds[f["kind"]+" "+f["standing"]]++
	}
	equal("breaches", kinds["breach open"], 4)
	equal("late flags", kinds["late open"], 2)
	equal("kinds of flags", len(kinds), 2)
	l, err := ledger.Open(filepath.Join(m.path, "ledger.db"), ledger.Options{Mode: ledger.ReadOnly})
	if err != nil {
		m.t.Fatal(err)
	}
	defer l.Close()
	v, err := l.Read()
	if err != nil {
		m.t.Fatal(err)
	}
	defer v.Close()
	last, _, err := v.LastPass()
	if err != nil {
		m.t.Fatal(err)
	}
	equal("passes", int(last.Number), 1+77+21) // the first load; those of the schedule; one before each deadline is judged
	for name, b := range m.boxes {
		// Nobody answers. At five and ten business days: ref 1 of the 5th on the 12th and 19th; 2 of the 12th on the 19th and 26th; 3 of the 13th on
		// the 20th and 27th; 4 of the 20th on the 27th.
		equal(name+": still open", b.count("STILL OPEN"), 7)
		equal(name+": breaches", b.count("BREACH birch"), 4+5)
		equal(name+": late feeds", b.count("LATE"), 2+2)
		equal(name+": daily lines", b.count("CHECKED"), 20)
	}
	desk, ops := m.boxes["desk"], m.boxes["ops"]
	equal("desk: all", len(desk.got), 26+7)
	equal("desk: late ones", desk.count("(late: of Thu 2000-01-20"), 3) // the breach, the line and what is still open of the 20th; that of the 21st is not a day old
	equal("desk: came back at noon", desk.count("22 12:0"), 4)
	equal("ops: all", len(ops.got), 27+7)
	equal("ops: word of the desk", ops.count("Channel desk delivers nothing: channel_not_found"), 1)
	equal("ops: daily lines that name it", ops.count("1 dead channel"), 2) // of the 20th and the 21st
	if m.t.Failed() {
		m.t.Logf("desk:\n%s\nops:\n%s", strings.Join(desk.got, "\n"), strings.Join(ops.got, "\n"))
	}
}
