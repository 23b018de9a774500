package main

import (
	"fmt"
	"net/http"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"syscall"
	"testing"
	"time"
)

// hostile is a series name that pings everyone, closes tags, and steers the direction of text.
const hostile = "<!channel> & *x* \u202egnp"

// deskFolder is a folder whose feed runs by itself only once a year, with channels of the fake service by name and console besides.
func deskFolder(t testing.TB, channels ...string) *folder {
	t.Helper()
	f := &folder{t, t.TempDir()}
	if err := os.Mkdir(filepath.Join(f.path, "inbox"), 0o755); err != nil {
		t.Fatal(err)
	}
	f.configure(deskConfig(channels...))
	f.must("init")
	return f
}

func deskConfig(channels ...string) string {
	s := `feeds:
  - {name: book, files: inbox/*.csv, unit: fraction, schedule: "0 3 1 1 *"}
ranges:
  - {name: own, window: 20}
channels:
  - {name: console, console: {}}
`
	for _, c := range channels {
		s += fmt.Sprintf("  - {name: %s, slack: {channel: %s}}\n", c, channelID(c))
	}
	return s
}

// channelID is the id of a channel of the fake by its name.
func channelID(name string) string { return "C000000" + strings.ToUpper(name) }

// storm is enough series for a digest, none so far out that the file gate takes the file for one in another unit.
func storm() (series []string, out map[string]float64) {
	out = map[string]float64{}
	for n := range 12 {
		series = append(series, fmt.Sprintf("fund-%02d", n))
		out[series[n]] = 0.04
	}
	return series, out
}

// What reaches the desk: of a first load its newest date only, of a day each breach, of a storm one digest, of a rerun nothing; and again
// what a person asks for again.
func TestDaemonTells(t *testing.T) {
	socketFolder(t)
	s := newChatService(t)
	f := deskFolder(t, "desk", "ops")
	d := f.daemon(s.env()...)
	series, out := storm()
	series = append(series, hostile)

	history := csvDays(series, 0, 28, map[string]float64{"fund-00": 0.3}) // old news
	history += strings.TrimPrefix(csvDays(series, 29, 30, map[string]float64{"fund-01": 0.25}), "date,series,return\n")
	f.arrive("a.csv", history)
	f.allSent()
	for _, name := range []string{"desk", "ops"} {
		posts := s.in(channelID(name))
		if len(posts) != 1 || !strings.Contains(posts[0].Text, "BREACH fund-01 returned +25.00 %") || !strings.Contains(posts[0].Text, weekday(30)) {
			t.Fatalf("after the first load %s has %q", name, posts)
		}
	}

	f.arrive("b.csv", csvDays(series, 31, 31, map[string]float64{hostile: -0.2}))
	f.allSent()
	p := s.in(channelID("desk"))[1]
	if !strings.HasPrefix(p.Text, "BREACH &lt;!channel&gt; &amp; *x*") || strings.Contains(p.Text+p.Blocks, "<!channel>") || strings.Contains(p.Text+p.Blocks, "\u202e") {
		t.Errorf("a hostile name reaches the desk as %q", p)
	}
	if p.Key == "" || p.Number == "" || strings.Contains(string(p.Metadata), "channel>") {
		t.Errorf("the message is marked with %s", p.Metadata)
	}
	if n := strings.Count(p.Text, "\n") + 1; n > 8 {
		t.Errorf("%d lines", n)
	}

	// Each of the two breaches has its chart in the thread of its message, in both channels.
	until(t, "the charts are there", func() bool { s.mu.Lock(); defer s.mu.Unlock(); return len(s.shown) == 4 })
	if want := fmt.Sprintf("%s/%s 960", p.Channel, p.Stamp); !slices.Contains(s.shown, want) {
		t.Errorf("charts %q, none is %s", s.shown, want)
	}

	f.arrive("c.csv", csvDays(series, 32, 32, out))
	f.allSent()
	if p := s.in(channelID("desk"))[2]; !strings.HasPrefix(p.Text, "DIGEST of 12 flags") {
		t.Errorf("a storm reaches the desk as %q", p.Text)
	}

	before := len(f.notices())
	f.must("pass", "--settled")
	f.write("inbox/d.csv", csvDays(series, 32, 32, out)) // the same content under another name
	f.must("pass", "--settled")
	if after := len(f.notices()); after != before {
		t.Errorf("a rerun makes %d notices", after-before)
	}
	f.must("notices", "again", p.Number)
	f.allSent()
	posts := s.in(channelID("desk"))
	if len(posts) != 4 || posts[3].Key != p.Key || posts[3].Number != p.Number || posts[3].Text != p.Text {
		t.Errorf("sent again: %q", posts[3:])
	}
	if code, _, errs := f.try("notices", "again", "999"); code != exitFailed || !strings.Contains(errs, "no notice has the number 999") {
		t.Errorf("again of nothing: %d %s", code, errs)
	}
	if n := strings.Count(d.out.String(), "BREACH"); n != 2 {
		t.Errorf("the console has %d breaches\n%s", n, d.out)
	}
	d.stop()
	if len(s.shown) != 5 || d.times("a notice goes without its chart") != 0 {
		t.Errorf("charts %q", s.shown) // the digest has none; that sent again has its own once more
	}
	f.must("ledger", "verify")
}

// Each way in which the service fails, at the first attempt of a channel of its own: in the end each notice is there once, save where
// the service asked for more patience than a test has.
func TestDaemonOutlastsTheService(t *testing.T) {
	socketFolder(t)
	s := newChatService(t)
	steps := map[string]http.HandlerFunc{
		"wait":  says(429, `{"ok":false,"error":"ratelimited"}`, "Retry-After: 1"),
		"slow":  says(429, ""), // without a time to wait
		"down":  says(500, "upstream"),
		"empty": says(200, "{}"),
		"proxy": says(200, "<html>please sign in</html>", "Content-Type: text/html"),
		"lost":  s.cut,
		"gone":  says(200, `{"ok":false,"error":"internal_error"}`),
	}
	var names []string
	for name, step := range steps {
		names = append(names, name)
		s.then(channelID(name), step)
	}
	f := deskFolder(t, names...)
	d := f.daemon(s.env()...)
	f.arrive("a.csv", csvDays([]string{"fund"}, 0, 30, map[string]float64{"fund": 0.2}))
	until(t, "all but one are sent", func() bool { return len(f.notices("--state", "sent")) == len(names) }) // with the console
	for _, name := range names {
		want := 1
		if name == "slow" {
			want = 0
		}
		if posts := s.in(channelID(name)); len(posts) != want {
			t.Errorf("channel %s has %d messages, want %d: %q", name, len(posts), want, posts)
		}
	}
	waits := f.notices("--state", "waiting")
	if len(waits) != 1 || waits[0]["channel"] != "slow" || !strings.Contains(waits[0]["error"], "429") {
		t.Errorf("waiting: %v", waits)
	}
	_, state := d.get("/state")
	if !strings.Contains(state, `"state": "waiting"`) {
		t.Errorf("no channel waits in %s", state)
	}
	d.stop()
}

// A channel that is gone keeps its notices, the others are told, and all is delivered once it is back.
func TestDaemonDeadChannel(t *testing.T) {
	socketFolder(t)
	s := newChatService(t)
	s.kill(channelID("desk"), "channel_not_found")
	f := deskFolder(t, "desk", "ops")
	d := f.daemon(s.env()...)
	f.arrive("a.csv", csvDays([]string{"fund"}, 0, 30, map[string]float64{"fund": 0.2}))
	const word = "Channel desk delivers nothing: channel_not_found"
	told := func() (n int) {
		for _, p := range s.in(channelID("ops")) {
			if strings.HasPrefix(p.Text, word) {
				n++
			}
		}
		return n
	}
	until(t, "ops is told of desk", func() bool { return told() == 1 })
	if code, body := d.get("/healthy"); code != http.StatusServiceUnavailable || !strings.Contains(body, `channel "desk" is dead`) {
		t.Errorf("/healthy: %d %s", code, body)
	}
	if code, _ := d.get("/ready"); code != http.StatusOK {
		t.Errorf("/ready: %d", code)
	}
	d.signal(syscall.SIGHUP) // it tries again, in vain; the others know already
	until(t, "desk is tried again", func() bool {
		return d.times("the channel delivers nothing until the next start or reload; its notices wait") == 2
	})
	f.arrive("b.csv", csvDays([]string{"fund"}, 31, 31, map[string]float64{"fund": -0.2}))
	until(t, "ops has the breach", func() bool { return len(s.in(channelID("ops"))) == 3 })
	if waits := f.notices("--state", "waiting"); len(waits) != 2 || told() != 1 || len(s.in(channelID("desk"))) != 0 {
		t.Errorf("waiting %v, told %d times", waits, told())
	}
	d.stop()

	s.kill(channelID("desk"), "")
	d = f.daemon(s.env()...)
	f.allSent()
	if posts := s.in(channelID("desk")); len(posts) != 2 || !strings.Contains(posts[0].Text, "+20.00 %") || !strings.Contains(posts[1].Text, "-20.00 %") {
		t.Errorf("desk has %q", posts)
	}
	if code, body := d.get("/healthy"); code != http.StatusOK {
		t.Errorf("/healthy: %d %s", code, body)
	}
	d.stop()
}

// The slots that fell due while no daemon ran: one pass, the deadline with its late flag, and the day's line.
func TestDaemonCatchesUp(t *testing.T) {
	socketFolder(t)
	s := newChatService(t)
	f := deskFolder(t, "desk")
	config := strings.Replace(deskConfig("desk"), `schedule: "0 3 1 1 *"`, `schedule: "0 * * * *", due: {at: "00:01"}`, 1)
	f.configure(config)
	name := filepath.Join("inbox", "a.csv")
	f.write(name, csvDays([]string{"fund"}, 0, 30, map[string]float64{"fund": 0.2}))
	old := time.Now().Add(-time.Hour)
	if err := os.Chtimes(filepath.Join(f.path, name), old, old); err != nil {
		t.Fatal(err)
	}
	week := time.Now().AddDate(0, 0, -7)
	for _, job := range []string{feedJob + "book", deadlineJob + "book", judged + "book", dailyJob} {
		f.owe(job, week)
	}
	d := f.daemon(s.env()...)
	daily := func() bool {
		for _, p := range s.in(channelID("desk")) {
			if strings.Contains(p.Text, "CHECKED") {
				return true
			}
		}
		return false
	}
	until(t, "the day's line is there", daily)
	flags := f.list("flags")
	late := 0
	for _, g := range flags {
		if g["kind"] == "late" {
			late++
		}
	}
	if late != 5 || len(flags) != 6 { // any seven days have five from Monday to Friday
		t.Errorf("flags: %v", flags)
	}
	d.stop()
	f.must("ledger", "verify")
}

// A feed whose folder cannot be looked into: its passes fail, which is told once a day, and it is late all the same.
func TestDaemonFailedPass(t *testing.T) {
	socketFolder(t)
	s := newChatService(t)
	f := deskFolder(t, "desk")
	f.configure(strings.Replace(deskConfig("desk"), `schedule: "0 3 1 1 *"`, `schedule: "0 * * * *", due: {at: "00:01"}`, 1))
	if err := os.Remove(filepath.Join(f.path, "inbox")); err != nil {
		t.Fatal(err)
	}
	for _, job := range []string{feedJob + "book", judged + "book"} {
		f.owe(job, time.Now().AddDate(0, 0, -7))
	}
	d := f.daemon(s.env()...)
	until(t, "five dates are late", func() bool { return len(f.list("flags", "--kind", "late")) == 5 })
	f.allSent()
	failed, late := 0, 0
	for _, p := range s.in(channelID("desk")) {
		switch {
		case strings.HasPrefix(p.Text, "FAILED: feed book: "):
			failed++
		case strings.HasPrefix(p.Text, "LATE feed book"):
			late++
		}
	}
	if failed != 1 || late != 5 {
		t.Errorf("the desk is told of %d failed passes and %d late files: %q", failed, late, s.posts)
	}
	if err := os.Mkdir(filepath.Join(f.path, "inbox"), 0o755); err != nil {
		t.Fatal(err)
	}
	f.arrive("a.csv", csvDays([]string{"fund"}, 0, 30, map[string]float64{"fund": 0.2}))
	until(t, "the breach is told", func() bool { return len(s.in(channelID("desk"))) == 7 })
	d.stop()
}

// A slot of the schedule's own, on the real clock. It waits beside other tests, so that its sockets' folder is for its daemon alone.
func TestDaemonSlot(t *testing.T) {
	if testing.Short() {
		t.Skip("waits for the next minute")
	}
	t.Parallel()
	dir, err := os.MkdirTemp("", "sd")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { os.RemoveAll(dir) })
	s := newChatService(t)
	f := deskFolder(t, "desk")
	f.configure(strings.Replace(deskConfig("desk"), `"0 3 1 1 *"`, `"* * * * *", settle: 1s`, 1))
	d := f.daemon(append(s.env(), "RUNTIME_DIRECTORY="+dir)...)
	f.write("inbox/a.csv", csvDays([]string{"fund"}, 0, 30, map[string]float64{"fund": 0.2}))
	until(t, "the breach is told", func() bool { return len(s.in(channelID("desk"))) == 1 })
	d.stop()
}
