package notify

import (
	"fmt"
	"testing"
	"time"

	"strayd/rules"
)

// What asks again is told where it was told of, whatever else the step has to tell: one message a series and date, one for a storm. Told
// of the same step twice, the keys are the same; of another, they are others.
func TestOpenAgain(t *testing.T) {
	teller := &Teller{Channels: []rules.Channel{{Name: "desk"}, {Name: "bonds", For: []string{"bond"}}, {Name: "limits", Kinds: []rules.Kind{rules.KindLimit}}}}
	news := goldenReopened("alder")
	told := map[string][]uint64{}
	for _, n := range teller.Notices(news) {
		equal(t, "kind", n.Kind, rules.KindReopened)
		told[n.Channel] = append(told[n.Channel], n.Refs...)
	}
	equal(t, "told", told, map[string][]uint64{"desk": {11, 12, 13, 31}, "bonds": {31}, "limits": {13}})
	equal(t, "same again", teller.Notices(news)[0].Key, teller.Notices(news)[0].Key)
	first := teller.Notices(news)[0].Key
	news.At = news.At.Add(time.Second)
	if teller.Notices(news)[0].Key == first {
		t.Error("what another step opens again has the same key")
	}
	for n := range 20 {
		news.Reopened = append(news.Reopened, breachOf(fmt.Sprint("series-", n), uint64(100+n)).Flag)
	}
	notices := teller.Notices(news)
	equal(t, "of a storm", notices[0].Lines[0], "OPEN AGAIN: 24 flags, see strayd flags")
	equal(t, "refs", len(notices[0].Refs), 24)
}
