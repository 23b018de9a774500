package ledger

import (
	"errors"
	"fmt"
	"path/filepath"
	"reflect"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

func notice(channel, key string, refs ...uint64) rules.Notice {
	return rules.Notice{Key: key, Channel: channel, Kind: rules.KindBreach, Refs: refs, Date: 20000, Made: noon, State: rules.NoticeWaiting,
		Lines: []string{"first", "second <with> \u202e marks"}}
}

func numbers(t *testing.T, l *Ledger) (list []string) {
	t.Helper()
	if err := l.Notices(func(n rules.Notice) bool {
		list = append(list, fmt.Sprintf("%d %s %s %s", n.Number, n.Channel, n.Key, n.State))
		return true
	}); err != nil {
		t.Fatal(err)
	}
	return list
}

func mark(t *testing.T, l *Ledger, n rules.Notice, s rules.NoticeState) {
	t.Helper()
	n.State = s
	if err := l.Mark(n); err != nil {
		t.Fatal(err)
	}
}

// The first waiting notice of a channel is the next one, in the order of their numbers; a sent one is kept and never comes again.
func TestOutboxOrder(t *testing.T) {
	l := fresh(t)
	if err := l.Add([]rules.Notice{notice("desk", "a"), notice("other", "b"), notice("desk", "c")}); err != nil {
		t.Fatal(err)
	}
	if err := l.Add([]rules.Notice{notice("desk", "a"), notice("desk", "d")}); err != nil { // a is there already
		t.Fatal(err)
	}
	for i, want := range []string{"a", "c", "d"} {
		n, ok, err := l.Next("desk")
		if err != nil || !ok || n.Key != want {
			t.Fatalf("%d: %v %v %q, want %q", i, err, ok, n.Key, want)
		}
		if i == 0 {
			w := notice("desk", "a")
			if w.Number = 1; !reflect.DeepEqual(n, w) {
				t.Errorf("%+v came back as %+v", w, n)
			}
		}
		n.Receipt = "r"
		mark(t, l, n, rules.NoticeSent)
	}
	if _, ok, err := l.Next("desk"); ok || err != nil {
		t.Errorf("something is left: %v", err)
	}
	want := []string{"1 desk a sent", "2 other b waiting", "3 desk c sent", "4 desk d sent"}
	if got := numbers(t, l); !reflect.DeepEqual(got, want) {
		t.Errorf("%q, want %q", got, want)
	}
	if err := l.Mark(rules.Notice{Number: 9}); !errors.Is(err, ErrNone) {
		t.Errorf("an unknown notice gives %v", err)
	}
}

func TestOutboxDepth(t *testing.T) {
	l := fresh(t)
	var list []rules.Notice
	for i := range 5 {
		n := notice("desk", fmt.Sprint(i))
		n.Made = noon.Add(time.Duration(i) * time.Minute)
		list = append(list, n)
	}
	if err := l.Add(list); err != nil {
		t.Fatal(err)
	}
	for i, s := range []rules.NoticeState{rules.NoticeSent, rules.NoticeFailed, rules.NoticeSending} {
		n, _, err := l.Next("desk")
		if err != nil || n.Number != uint64(i+1) {
			t.Fatal(n.Number, err)
		}
		mark(t, l, n, s)
	}
	waiting, failed, oldest, err := l.Depth("desk") // one being sent counts as waiting
	if waiting != 3 || failed != 1 || !oldest.Equal(noon.Add(2*time.Minute)) || err != nil {
		t.Errorf("%d waiting, %d failed, oldest %v, %v", waiting, failed, oldest, err)
	}
	sending, err := l.Sending("desk")
	if err != nil || len(sending) != 1 || sending[0].Number != 3 {
		t.Errorf("%v being sent, %v", sending, err)
	}
	if _, err := l.Verify(t.Context(), VerifyOptions{}); err != nil {
		t.Error(err)
	}
}

// Notices come with their step, and one whose flags all became history before it left is taken back.
func TestOutboxWithStep(t *testing.T) {
	l := fresh(t)
	b := &watcher.Batch{Step: 1, File: fileRow(1), Notices: []rules.Notice{notice("desk", "a", 1), notice("desk", "b", 1, 2), notice("desk", "c", 2)}}
	publish(t, l, b)
	n, _, _ := l.Next("desk")
	mark(t, l, n, rules.NoticeSent)
	publish(t, l, &watcher.Batch{Step: 2, File: fileRow(2), Withdraw: []uint64{1, 2}, Notices: []rules.Notice{notice("desk", "c", 3), notice("desk", "d", 3)}})
	want := []string{"1 desk a sent", "2 desk b withdrawn", "3 desk c withdrawn", "4 desk d waiting"}
	if got := numbers(t, l); !reflect.DeepEqual(got, want) {
		t.Errorf("%q, want %q", got, want)
	}
	back := notice("desk", "b", 1, 2)
	back.Number, back.State = 2, rules.NoticeSending
	if err := l.Mark(back); err == nil { // whoever took it up before it was withdrawn is told so
		t.Error("a withdrawn notice can be sent")
	}
	if _, err := l.Verify(t.Context(), VerifyOptions{}); err != nil {
		t.Error(err)
	}
}

// Channels that are the start of one another keep their queues apart.
func TestOutboxChannelsApart(t *testing.T) {
	l := fresh(t)
	if err := l.Add([]rules.Notice{notice("de", "a"), notice("desk", "b"), notice("desk-two", "c")}); err != nil {
		t.Fatal(err)
	}
	for channel, key := range map[string]string{"de": "a", "desk": "b", "desk-two": "c"} {
		waiting, _, _, err := l.Depth(channel)
		n, _, nextErr := l.Next(channel)
		if waiting != 1 || n.Key != key || err != nil || nextErr != nil {
			t.Errorf("channel %s: %d waiting, next %q, %v, %v", channel, waiting, n.Key, err, nextErr)
		}
	}
}

func TestSlots(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ledger.db")
	l, err := Open(path, Options{Mode: Create, AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	if slot, err := l.LastSlot("feed a"); !slot.IsZero() || err != nil {
		t.Errorf("an unknown job has slot %v, %v", slot, err)
	}
	for _, slot := range []time.Time{noon, noon.Add(time.Hour), noon.Add(time.Minute)} { // also back, after a clock was put right
		if err := l.Done("feed a", slot); err != nil {
			t.Fatal(err)
		}
	}
	if err := l.Close(); err != nil {
		t.Fatal(err)
	}
	if l, err = Open(path, Options{AnyFilesystem: true}); err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	if slot, err := l.LastSlot("feed a"); !slot.Equal(noon.Add(time.Minute)) || err != nil {
		t.Errorf("slot %v, %v", slot, err)
	}
}

// Layers tells which step gave which value.
func TestLayersByStep(t *testing.T) {
	l := fresh(t)
	publish(t, l, &watcher.Batch{Step: 1, File: fileRow(1), NewNames: names(0, 3), Returns: []*watcher.Column{column(20000, 0, 10, 20, 30)}})
	publish(t, l, &watcher.Batch{Step: 2, File: fileRow(2), Returns: []*watcher.Column{column(20000, 0, watcher.Missing32, 25)}})
	var got []string
	err := read(t, l).Layers(watcher.Returns, 20000, 0, func(step uint32, vals []int64) error {
		for i, v := range vals {
			if v != watcher.Missing64 {
				got = append(got, fmt.Sprintf("step %d offset %d", step, i))
			}
		}
		return nil
	})
	want := []string{"step 1 offset 0", "step 1 offset 1", "step 1 offset 2", "step 2 offset 1"}
	if err != nil || !reflect.DeepEqual(got, want) {
		t.Errorf("%q, %v, want %q", got, err, want)
	}
}

// A notice that moves to another channel leaves the one queue and stands in the other, in the order of the numbers; the ledger stays whole.
func TestOutboxMoves(t *testing.T) {
	l := fresh(t)
	if err := l.Add([]rules.Notice{notice("desk", "a"), notice("ops", "b"), notice("desk", "c")}); err != nil {
		t.Fatal(err)
	}
	waiting, err := l.Waiting("desk")
	if err != nil || len(waiting) != 2 || waiting[0].Key != "a" || waiting[1].Key != "c" {
		t.Fatal(waiting, err)
	}
	n := waiting[0]
	n.Channel, n.For = "ops", "desk"
	mark(t, l, n, rules.NoticeWaiting)
	for channel, want := range map[string]string{"desk": "c", "ops": "a"} {
		if n, ok, err := l.Next(channel); err != nil || !ok || n.Key != want {
			t.Errorf("%s: %q, %v, %v", channel, n.Key, ok, err)
		}
	}
	moved, err := l.Waiting("ops")
	if err != nil || len(moved) != 2 || moved[0].For != "desk" {
		t.Errorf("%+v, %v", moved, err)
	}
	if _, err := l.Verify(t.Context(), VerifyOptions{}); err != nil {
		t.Error(err)
	}
}
