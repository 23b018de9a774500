package notify_test

import (
	"fmt"
	"strings"
	"testing"
	"time"

	"strayd/notify"
	"strayd/rules"
)

// What somebody did reaches the channels that take the flags, in eight lines or fewer, hostile names and notes made harmless; a short
// channel gets refs and series only.
func TestUpdates(t *testing.T) {
	at := time.Date(2026, 3, 13, 7, 40, 0, 0, time.UTC)
	act := rules.Act{Deed: rules.Decide, Step: 9, By: rules.Person{UID: 1001, Name: "ada"}, At: at, Conclusion: rules.Genuine, Value: rules.Missing,
		Reason: rules.MarketMove, Note: "line one\nline two \u202e @everyone", Override: "the index is down", Until: rules.NoDate}
	teller := &notify.Teller{Channels: []rules.Channel{{Name: "desk", Kind: "slack"}, {Name: "bonds", Kind: "slack", For: []string{"bond"}},
		{Name: "wide", Kind: "slack", Short: true}}}
	for _, n := range []int{1, 2, 4, 5, 900} {
		news := rules.ActNews{Act: act}
		for i := range n {
			news.Flags = append(news.Flags, rules.Flag{Ref: uint64(i + 1), Series: fmt.Sprint("fund\n\u202e", i), Group: "equity", Kind: rules.KindBreach,
				Date: 20525, Return: 1e13, Standing: rules.Decided})
		}
		out := teller.Updates(news)
		each, refs := 1, n // up to three values have a message each
		if n <= 3 {
			each, refs = n, 1
		}
		if len(out) != 2*each || out[0].Channel != "desk" || out[each].Channel != "wide" || out[0].Key == out[each].Key {
			t.Fatalf("%d flags: %+v", n, out)
		}
		for _, u := range out {
			text := strings.Join(u.Lines, "\n")
			if u.Kind != rules.KindUpdate || len(u.Refs) != refs || len(u.Lines) > 8 || strings.Contains(text, "\u202e") || strings.Count(text, "\n") != len(u.Lines)-1 {
				t.Errorf("%d flags: %+v", n, u)
			}
			if said := strings.Contains(text, "ada") && strings.Contains(text, "index") && strings.Contains(text, "line two"); said == (u.Channel == "wide") {
				t.Errorf("%d flags, %s:\n%s", n, u.Channel, text)
			}
			if !strings.HasPrefix(text, "DECIDED: ") || n == 1 && !strings.HasSuffix(u.Lines[0], ", ref 1") {
				t.Errorf("%d flags: the first line is %q", n, u.Lines[0])
			}
		}
	}
	one := []rules.Flag{{Ref: 1, Series: "x"}}
	first := teller.Updates(rules.ActNews{Act: act, Flags: one})
	act.Step = 10
	if later := teller.Updates(rules.ActNews{Act: act, Flags: one}); later[0].Key == first[0].Key {
		t.Error("two acts about one flag have one key: the second would not be told")
	}
}
