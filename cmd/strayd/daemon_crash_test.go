package main

import (
	"fmt"
	"math/rand/v2"
	"os"
	"slices"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"
)

// crashRounds is how many times to kill the daemon: 10, 3 with -short, or as STRAYD_CRASHES says.
func crashRounds(t *testing.T) int {
	switch {
	case os.Getenv("STRAYD_CRASHES") != "":
		return rounds(t)
	case testing.Short():
		return 3
	}
	return 10
}

// crashing is a daemon that is killed again and again, each time in the middle of something.
type crashing struct {
	*folder
	service *chatService
	r       *rand.Rand
	series  []string
	day     int            // the next one to be delivered
	rows    map[string]int // lines of the export that are owed
	kills   map[string]int // by what was going on
}

// Kills the daemon at random points of passes and calls. In the end every observation is held once, every flag was told to both channels,
// there is at most one repeat a kill, over both channels, which says that it may be one, and none where the service can say what arrived.
func TestDaemonCrashes(t *testing.T) {
	for _, blind := range []bool{false, true} {
		t.Run(fmt.Sprintf("blind %v", blind), func(t *testing.T) {
			socketFolder(t)
			seed := rand.Uint64()
			c := &crashing{folder: deskFolder(t, "desk", "ops"), service: newChatService(t), r: rand.New(rand.NewPCG(seed, 11)),
				rows: map[string]int{}, kills: map[string]int{}}
			c.service.blind = blind
			for n := range 40 {
				c.series = append(c.series, fmt.Sprintf("fund-%02d", n))
			}
			c.write("inbox/0000.csv", csvDays(c.series, 0, 39, nil))
			c.owed(c.series, 0, 39)
			c.must("pass", "--settled")
			c.day = 40
			for range (crashRounds(t) + 1) / 2 {
				c.round()
			}
			c.finish()
			c.count(seed, blind)
		})
	}
}

// owed notes what the export must hold.
func (c *crashing) owed(series []string, from, upto int) {
	for n := from; n <= upto; n++ {
		for _, s := range series {
			c.rows[weekday(n)+","+s]++
		}
	}
}

// deliver puts the file of the next day into the inbox, with a breach or two; now and then a large one of series of its own.
func (c *crashing) deliver() {
	last := map[string]float64{c.series[c.r.IntN(40)]: 0.3 + float64(c.day)/1e4}
	if c.r.IntN(3) == 0 {
		last[c.series[c.r.IntN(40)]] = -0.3
	}
	c.write(fmt.Sprintf("inbox/%04d.csv", c.day), csvDays(c.series, c.day, c.day, last))
	c.owed(c.series, c.day, c.day)
	c.day++
}

// round starts the daemon, has it pass over a new file, and kills it: so long after the pass was asked for, or at a stage of a call.
func (c *crashing) round() {
	c.deliver()
	d := c.daemon(c.service.env()...)
	killed := make(chan struct{})
	var once sync.Once
	kill := func(when string) {
		once.Do(func() {
			c.kills[when]++
			_ = d.cmd.Process.Kill() // an error says that it has ended
			close(killed)
		})
	}
	c.service.lose(c.r.IntN(2) == 0)
	stages := []string{"before", "taken", "after"}
	if at := c.r.IntN(6); at < len(stages) {
		calls := 1 + c.r.IntN(2)
		c.service.watch(func(stage string) {
			if stage == stages[at] {
				if calls--; calls == 0 {
					kill("call " + stage)
				}
			}
		})
	} else {
		time.AfterFunc(time.Duration(c.r.IntN(60))*time.Millisecond, func() { kill("pass") })
	}
	_, _, _ = c.try("pass", "--settled") // may be cut off
	select {
	case <-killed:
	case <-time.After(3 * time.Second):
		kill("idle") // the call that it was to die at never came
	}
	c.service.watch(nil)
	<-d.done
	c.service.lose(false)
	if c.r.IntN(8) == 0 {
		c.settle()
	}
}

// watch sets what is called at each stage of each call, one at a time.
func (s *chatService) watch(hook func(stage string)) {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.hook = nil; hook != nil {
		var one sync.Mutex
		s.hook = func(stage string) {
			one.Lock()
			defer one.Unlock()
			hook(stage)
		}
	}
}

// lose makes the service lose the calls whose maker dies before they are taken; otherwise it takes them, as it may.
func (s *chatService) lose(yes bool) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.loses = yes
}

// settle lets a daemon catch up and stop in peace.
func (c *crashing) settle() {
	d := c.daemon(c.service.env()...)
	c.must("pass", "--settled")
	c.allSent()
	d.stop()
}

// finish lets everything be taken and told, and holds the ledger against what was delivered.
func (c *crashing) finish() {
	c.settle()
	c.must("ledger", "verify")
	for i, line := range strings.Split(strings.TrimSpace(c.must("ledger", "export")), "\n") {
		if i > 0 {
			c.rows[strings.Join(strings.Split(line, ",")[:2], ",")]--
		}
	}
	for cell, n := range c.rows {
		if n != 0 {
			c.t.Errorf("observation %s is held %d times too few", cell, n)
		}
	}
}

// count holds the messages that the service took against the flags and the outbox.
func (c *crashing) count(seed uint64, blind bool) {
	c.t.Helper()
	all, repeats := 0, 0
	for _, n := range c.kills {
		all += n
	}
	told := map[string][]string{} // refs by channel
	for _, n := range c.notices() {
		told[n["channel"]] = append(told[n["channel"]], strings.Fields(n["refs"])...)
	}
	for _, channel := range []string{"desk", "ops"} {
		times := map[string]int{}
		for _, p := range c.service.in(channelID(channel)) {
			if times[p.Number]++; times[p.Number] > 1 && !strings.Contains(p.Text, "(possible repeat)") {
				c.t.Errorf("seed %d: a repeat does not say so: %q", seed, p.Text)
			}
		}
		again := len(c.service.in(channelID(channel))) - len(times)
		if repeats += again; repeats > all || !blind && again > 0 {
			c.t.Errorf("seed %d: %d repeats up to channel %s after %d kills", seed, repeats, channel, all)
		}
		for _, n := range c.notices("--channel", channel) {
			if times[n["number"]] == 0 || n["state"] != "sent" {
				c.t.Errorf("seed %d: notice %s is %s and arrived %d times", seed, n["number"], n["state"], times[n["number"]])
			}
		}
		for _, f := range c.list("flags") {
			if !slices.Contains(told[channel], f["ref"]) {
				c.t.Errorf("seed %d: channel %s was never told of flag %s", seed, channel, f["ref"])
			}
		}
	}
	c.t.Logf("seed %d: %d kills %v; %d days, %s flags, %d messages, %d repeats", seed, all, c.kills, c.day,
		strconv.Itoa(len(c.list("flags"))), len(c.service.posts), repeats)
	if all == 0 {
		c.t.Error("no kill")
	}
}
