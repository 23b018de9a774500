package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"log/slog"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher/desk"
	"strayd/watcher/ledger"
)

// fourEyes is a book whose first fund is in a group that asks for a second person.
const fourEyes = deskBook + "groups:\n  - {name: pair, series: [fund-00], four_eyes: true}\n"

const deskBook = `feeds:
  - {name: book, files: inbox/*.csv, unit: fraction, schedule: "0 3 1 1 *"}
ranges:
  - {name: own, window: 20}
`

// flaggedFolder is a folder in which every fund has one open breach; the refs go up with the funds' numbers.
func flaggedFolder(t testing.TB, keys string) *folder {
	t.Helper()
	f := &folder{t, t.TempDir()}
	if err := os.Mkdir(filepath.Join(f.path, "inbox"), 0o755); err != nil {
		t.Fatal(err)
	}
	f.configure(keys)
	f.must("init")
	series, out := storm()
	f.arrive("a.csv", csvDays(series, 0, 30, out))
	return f
}

// besides are the daemon's parts that carry out commands, without its process: who is at the socket is given.
type besides struct {
	t testing.TB
	d *daemon
}

func (f *folder) beside() *besides {
	f.t.Helper()
	c, err := config.Load(filepath.Join(f.path, "strayd.yaml"), configOptions())
	if err != nil {
		f.t.Fatal(err)
	}
	l, err := openLedger(c, ledger.ReadWrite)
	if err != nil {
		f.t.Fatal(err)
	}
	f.t.Cleanup(func() { l.Close() })
	d := &daemon{log: slog.New(slog.NewTextHandler(io.Discard, nil)), ledger: l, passing: make(chan struct{}, 1),
		program: &app{ctx: f.t.Context(), out: io.Discard, err: io.Discard}}
	d.beats.begun = make(chan struct{})
	if d.setup, err = d.prepare(c); err != nil {
		f.t.Fatal(err)
	}
	return &besides{f.t, d}
}

var (
	alice = rules.Person{UID: 1001, Name: "alice"}
	bob   = rules.Person{UID: 1002, Name: "bob"}
	// alias is alice under another name.
	alias = rules.Person{UID: 1001, Name: "bob"}
)

// as carries a command out for somebody.
func (b *besides) as(ctx context.Context, who rules.Person, args ...string) (code int, text string) {
	var out bytes.Buffer
	code = b.d.command(ctx, desk.Call{Args: args, Settings: b.d.setup.hash, Who: who}, &out, &out)
	return code, out.String()
}

func (b *besides) expect(who rules.Person, line string, code int, want string) {
	b.t.Helper()
	if got, text := b.as(b.t.Context(), who, strings.Fields(line)...); got != code || !strings.Contains(text, want) {
		b.t.Errorf("%s as %s: exit %d, want %d and %q\n%s", line, who, got, code, want, text)
	}
}

// In a group that asks for four eyes a decided flag waits, and holds the release back, until another person signs it off; elsewhere one
// person may do both.
func TestFourEyes(t *testing.T) {
	b := flaggedFolder(t, fourEyes).beside()
	b.expect(alice, "decide 1 2 error --reason data-error --note resent", exitDone, "A second person must agree: strayd sign-off 1\n")
	b.expect(alice, "flags --format csv --series fund-00", exitDone, ",decided,data error,")
	b.expect(alice, "flags --blocking pair", exitFailed, "fund-00")
	b.expect(alice, "sign-off 1 2", exitFailed, "flag 1 was decided by alice (uid 1001): a second person must sign it off")
	b.expect(alias, "sign-off 1", exitFailed, "a second person must sign it off")
	b.expect(alice, "sign-off 2", exitDone, "signed off, by alice (uid 1001)")
	b.expect(bob, "sign-off 1 --note agreed", exitDone, "signed off (agreed), by bob (uid 1002)")
	b.expect(bob, "flags --blocking pair", exitDone, "No flag fits")
	b.expect(bob, "decide 1 genuine --reason unexplained --note thought-again", exitDone, "A second person must agree")
	b.expect(bob, "sign-off 1", exitFailed, "a second person must sign it off")
	b.expect(alice, "sign-off 1", exitDone, "signed off")
	b.expect(alice, "explain 1", exitDone, "by bob (uid 1002) (genuine; unexplained; thought-again)")
	b.expect(rules.Person{Name: "root"}, "acknowledge 3", exitDone, "note: done as root, which the record says")
	b.expect(alice, "explain 3", exitDone, "by root (uid 0), as root")
	b.expect(alice, "ledger verify", exitDone, "is whole")
	b.expect(alice, "decide 4 error --reason data-error --note x --now 2026-01-01", exitUsage, "--now")
}

// So does a waiver: until another person signs it off, the flag still asks and holds the release back; then up to its end it does not.
func TestFourEyesOfWaivers(t *testing.T) {
	b := flaggedFolder(t, fourEyes).beside()
	until := time.Now().AddDate(0, 0, 9).Format(time.DateOnly)
	b.expect(alice, "waive 1 2 --until "+until, exitDone, "A second person must agree: strayd sign-off 1\n")
	b.expect(alice, "flags --format csv", exitDone, ",waived,")
	b.expect(alice, "flags --blocking pair", exitFailed, "fund-00")
	b.expect(alice, "sign-off 1", exitFailed, "flag 1 was waived by alice (uid 1001): a second person must sign it off")
	b.expect(alias, "sign-off 1", exitFailed, "a second person must sign it off")
	b.expect(bob, "sign-off 2", exitFailed, "flag 2 is waived by alice (uid 1001): only what is decided")
	b.expect(alice, "decide 3 error --reason data-error --note x", exitDone, "decided")
	b.expect(bob, "sign-off 1 3", exitFailed, "sign them off apart")
	b.expect(bob, "sign-off 1", exitDone, "waived (until ")
	b.expect(bob, "flags --blocking pair", exitDone, "No flag fits")
	b.expect(bob, "sign-off 1", exitFailed, "flag 1 is waived by bob")
	b.expect(bob, "explain 1", exitDone, "by bob (uid 1002)")
	b.expect(alice, "ledger verify", exitDone, "is whole")
	b.expect(bob, "waive 1", exitDone, "A second person must agree: strayd sign-off 1\n")
	b.expect(bob, "flags --blocking pair", exitFailed, "fund-00")
	b.expect(alice, "sign-off 1", exitDone, "waived (until ")
	b.expect(alice, "decide 1 genuine --reason unexplained --note x", exitDone, "A second person must agree")
	b.expect(bob, "sign-off 1", exitDone, "signed off")
	b.expect(alice, "ledger verify", exitDone, "is whole")
}

// Where root is forbidden, nothing that root says enters the record; where it is not, it is marked.
func TestRootForbidden(t *testing.T) {
	b := flaggedFolder(t, fourEyes+"root: forbidden\n").beside()
	root := rules.Person{Name: "root"}
	for _, line := range []string{"acknowledge 1", "decide 2 error --reason data-error --note x", "waive 2", "sign-off 2", "accept a.csv --note x"} {
		b.expect(root, line, exitFailed, "root may enter nothing into the record (root: forbidden)")
	}
	b.expect(root, "flags --format csv", exitDone, "1,")
	b.expect(alice, "acknowledge 1", exitDone, "acknowledged, by alice")
	b.expect(alice, "ledger verify", exitDone, "2 entries in the record")
}

// A decision waits for the pass under way; one whose caller hangs up meanwhile is not made, and no other is lost.
func TestDecisionsWaitTheirTurn(t *testing.T) {
	b := flaggedFolder(t, deskBook).beside()
	release, err := b.d.alone(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	gone, hangUp := context.WithCancel(t.Context())
	var calls sync.WaitGroup
	for n := 1; n <= 11; n++ {
		calls.Go(func() {
			b.expect(alice, fmt.Sprintf("decide %d error --reason data-error --note x", n), exitDone, "decided")
		})
	}
	calls.Go(func() {
		if code, text := b.as(gone, bob, "acknowledge", "12"); code != exitFailed {
			t.Errorf("a caller who hung up: exit %d\n%s", code, text)
		}
	})
	hangUp()
	release()
	for range 5 {
		b.expect(bob, "pass --settled", exitDone, "0 files accepted")
	}
	calls.Wait()
	_, text := b.as(t.Context(), alice, "flags", "--all", "--format", "csv")
	if n := strings.Count(text, ",decided,"); n != 11 {
		t.Errorf("%d of 11 decisions are made\n%s", n, text)
	}
	b.expect(alice, "ledger verify", exitDone, "12 entries in the record")
}

// Without a daemon only the user to whom the ledger belongs may enter anything.
func TestOnlyTheOwnerActsAlone(t *testing.T) {
	f := flaggedFolder(t, deskBook)
	stranger := rules.Person{UID: os.Getuid() + 1, Name: "stranger"}
	for _, line := range []string{"acknowledge 1", "decide 1 error --reason data-error --note x", "waive 1", "sign-off 1", "accept a.csv --note x"} {
		var out bytes.Buffer
		a := &app{ctx: t.Context(), out: &out, err: &out, who: &stranger}
		if code := a.execute(append([]string{"--config", filepath.Join(f.path, "strayd.yaml")}, strings.Fields(line)...)); code != exitFailed ||
			!strings.Contains(out.String(), "only its owner may enter anything") {
			t.Errorf("%s: exit %d\n%s", line, code, out.String())
		}
	}
	if n := len(f.list("flags")); n != 12 {
		t.Errorf("%d flags are open", n)
	}
}

// The kernel says who is at the socket: a real second user signs off, whatever the environment says. It needs root, to become one.
func TestSecondUserAtTheSocket(t *testing.T) {
	if os.Getuid() != 0 {
		t.Skip("only root may become another user")
	}
	runtime := socketFolder(t)
	if err := os.Chmod(runtime, 0o710); err != nil { // the group may enter
		t.Fatal(err)
	}
	f := flaggedFolder(t, fourEyes)
	if err := os.Chmod(filepath.Dir(f.path), 0o755); err != nil { // every user may read the configuration
		t.Fatal(err)
	}
	program := filepath.Join(publicFolder(t), "strayd")
	copyProgram(t, program)
	d := f.daemon()
	f.must("decide", "1", "error", "--reason", "data error", "--note", "x")
	if code, _, errs := f.try("sign-off", "1"); code != exitFailed || !strings.Contains(errs, "a second person") {
		t.Errorf("the same person: exit %d\n%s", code, errs)
	}
	cmd := exec.Command(program, "--config", filepath.Join(f.path, "strayd.yaml"), "sign-off", "1")
	cmd.Env = append(os.Environ(), asProgram+"=1", "USER=root", "LOGNAME=root")
	cmd.Dir = "/"
	cmd.SysProcAttr = &syscall.SysProcAttr{Credential: &syscall.Credential{Uid: 64123, Gid: 0, NoSetGroups: true}}
	text, err := cmd.CombinedOutput()
	if err != nil || !strings.Contains(string(text), "signed off, by uid 64123") {
		t.Errorf("another user: %v\n%s", err, text)
	}
	d.stop()
	f.must("ledger", "verify")
}

// What somebody does about a flag is told in the thread of the message that told of it; a channel that was not told of the flag is not
// told of that.
func TestDaemonTellsOfActs(t *testing.T) {
	socketFolder(t)
	s := newChatService(t)
	f := deskFolder(t, "desk")
	d := f.daemon(s.env()...)
	series, _ := storm()
	f.arrive("a.csv", csvDays(series, 0, 29, map[string]float64{"fund-00": 0.3}))
	f.arrive("b.csv", csvDays(series, 30, 30, map[string]float64{"fund-01": 0.25}))
	f.arrive("c.csv", csvDays(series, 31, 31, map[string]float64{"fund-02": 0.25}))
	f.allSent()
	told := s.in(channelID("desk"))
	if len(told) != 3 {
		t.Fatalf("the desk has %d messages", len(told))
	}
	f.must("acknowledge", "2")
	f.must("decide", "2", "3", "corrected", "0.25%", "--reason", "data error", "--note", "<!channel> resent")
	f.allSent()
	posts := s.in(channelID("desk"))[3:]
	if len(posts) != 3 || posts[0].Thread != told[1].Stamp || !strings.HasPrefix(posts[0].Text, "ACKNOWLEDGED: fund-01, ref 2") {
		t.Fatalf("an acknowledgement reaches the desk as %q", posts)
	}
	for n, p := range posts[1:] { // each in the thread of its own flag
		if p.Thread != told[1+n].Stamp || !strings.HasPrefix(p.Text, fmt.Sprintf("DECIDED: fund-%02d, ref %d\nCorrected to +0.25 %%, data error, by ", n+1, n+2)) ||
			strings.Contains(p.Text+p.Blocks, "<!channel>") {
			t.Errorf("a decision reaches the desk as %q", p)
		}
	}

	// A restatement opens again what was decided: the thread says so, and the channel sees it.
	f.arrive("d.csv", csvDays(series, 31, 31, map[string]float64{"fund-02": 0.0005}))
	f.allSent()
	again := 0
	for _, p := range s.in(channelID("desk"))[6:] {
		if !strings.HasPrefix(p.Text, "OPEN AGAIN: ") {
			continue
		}
		again++
		if p.Thread != told[2].Stamp || p.Broadcast != "true" || !strings.HasPrefix(p.Text, "OPEN AGAIN: BREACH fund-02 returned +25.00 %") ||
			!strings.Contains(p.Text, "Restated to ") || !strings.Contains(p.Text, "strayd decide 3 ") {
			t.Errorf("the desk is told %q", p)
		}
	}
	if again != 1 || posts[0].Broadcast != "" {
		t.Errorf("told of %d reopened flags", again)
	}
	d.stop()
	f.must("ledger", "verify")
}

// publicFolder is a folder that every user may enter.
func publicFolder(t *testing.T) string {
	t.Helper()
	dir, err := os.MkdirTemp("", "sp")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { os.RemoveAll(dir) })
	if err := os.Chmod(dir, 0o755); err != nil {
		t.Fatal(err)
	}
	return dir
}

// copyProgram copies the test's own program, which may lie where only its owner may enter.
func copyProgram(t *testing.T, to string) {
	t.Helper()
	from, err := os.Open(os.Args[0])
	if err != nil {
		t.Fatal(err)
	}
	defer from.Close()
	into, err := os.OpenFile(to, os.O_CREATE|os.O_WRONLY, 0o755)
	if err != nil {
		t.Fatal(err)
	}
	_, err = io.Copy(into, from)
	if err = errors.Join(err, into.Close()); err != nil {
		t.Fatal(err)
	}
}

// Kills decisions at random moments. Each is made wholly (the flags, the windows, the record) or not at all.
func TestDecisionsKilled(t *testing.T) {
	f := &folder{t, t.TempDir()}
	if err := os.Mkdir(filepath.Join(f.path, "inbox"), 0o755); err != nil {
		t.Fatal(err)
	}
	f.configure(deskBook)
	f.must("init")
	var names []string
	for n := range 300 {
		names = append(names, fmt.Sprintf("s-%03d", n))
	}
	f.write("inbox/a.csv", csvDays(names, 0, 40, map[string]float64{"s-007": 0.3, "s-008": 0.3}))
	f.write("inbox/b.csv", csvDays(names, 41, 600, nil))
	f.must("pass", "--settled")
	refs := []string{f.list("flags", "--all", "--series", "s-007")[0]["ref"], f.list("flags", "--all", "--series", "s-008")[0]["ref"]}
	seed := rand.Uint64()
	t.Logf("seed %d", seed)
	r := rand.New(rand.NewPCG(seed, 1))
	made, kills, lasting := 0, 0, time.Hour // the first is not killed
	for n := range rounds(t) {
		value := fmt.Sprintf("0.00%03d1", 101+n)
		begun, after := time.Now(), lasting
		if n > 0 {
			after = time.Duration(r.Int64N(int64(lasting + lasting/4)))
		}
		code := f.killedDecision(after, refs[0], refs[1], "corrected", value, "--reason", "data error", "--note", "x")
		if code == exitDone {
			lasting = time.Since(begun)
		} else {
			kills++
		}
		var taken []string
		for _, series := range []string{"s-007", "s-008"} {
			taken = append(taken, f.list("history", series, "--from", weekday(40), "--to", weekday(40))[0]["used"])
		}
		now := taken[0] == value
		if now != (taken[1] == value) || code == exitDone && !now {
			t.Fatalf("exit %d of %s: the windows take %v", code, value, taken)
		}
		if now {
			made++
		}
		out := f.must("ledger", "verify")
		if want := fmt.Sprintf("%s in the record", rules.Counted(1+made, "entry")); !strings.Contains(out, want) {
			t.Fatalf("%d decisions are made, and\n%s", made, out)
		}
	}
	t.Logf("%d killed, %d made", kills, made)
	if kills == 0 {
		t.Error("no kill came before the end of a decision")
	}
}

// killedDecision runs decide in a process of its own and kills it after a time.
func (f *folder) killedDecision(after time.Duration, args ...string) (code int) {
	f.t.Helper()
	cmd := exec.Command(os.Args[0], append([]string{"--config", filepath.Join(f.path, "strayd.yaml"), "decide"}, args...)...)
	cmd.Env = append(os.Environ(), asProgram+"=1")
	if err := cmd.Start(); err != nil {
		f.t.Fatal(err)
	}
	timer := time.AfterFunc(after, func() { _ = cmd.Process.Kill() }) // an error says that it has ended
	defer timer.Stop()
	_ = cmd.Wait() // the state tells
	return cmd.ProcessState.ExitCode()
}
