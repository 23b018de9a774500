package rules

import (
	"bytes"
	"testing"
)

func TestReferenceOfASeries(t *testing.T) {
	s := Settings{Groups: []Group{{Name: "equity", Series: []string{"alder-*"}, Reference: "index"}, {Name: "bond", Reference: "peers"}, {Name: "cash"}}}
	s.Register([]Series{{ID: "birch", Group: "bond", Start: NoDate, End: NoDate}, {ID: "alder-x", Reference: "other", FX: "eurusd", Start: 7, End: NoDate},
		{ID: "alder-n", Reference: "none", Start: NoDate, End: NoDate}, {ID: "index", Group: "equity", Start: NoDate, End: NoDate},
		{ID: "lone", Reference: "peers", FX: "lone", Start: NoDate, End: NoDate}, {ID: "fir", Group: "wood", Start: NoDate, End: NoDate}, {ID: "dale", Group: "cash", Start: NoDate, End: NoDate}})
	m, err := NewMembership(&s)
	if err != nil {
		t.Fatal(err)
	}
	tests := []struct{ id, reference, currency string }{
		{"alder-1", "index", ""},       // blank takes the group's
		{"alder-x", "other", "eurusd"}, // the register's own wins
		{"alder-n", "", ""},            // none means none
		{"birch", PeersReference, ""},  // by the register's group
		{"dale", "", ""},               // its group has none
		{"fir", PeersReference, ""},    // of a group that only the register names
		{"elder", "", ""},              // no group
		{"index", "", ""},              // nothing is its own reference,
		{"lone", "", ""},               // without a group there are no peers, and nothing is its own currency
	}
	for _, tt := range tests {
		if r, c := m.Reference(tt.id, m.Group(tt.id)), m.Currency(tt.id); r != tt.reference || c != tt.currency {
			t.Errorf("%s: reference %q and currency %q, want %q and %q", tt.id, r, c, tt.reference, tt.currency)
		}
	}
	if m.Lone() {
		t.Error("a book with groups is lone")
	}
	if len(s.Lives) != 1 || s.Lives["alder-x"].Start != 7 {
		t.Errorf("lives %v", s.Lives)
	}
}

// What a ledger of before recorded has neither references nor events, and is written again byte for byte.
func TestSettingsOfBeforeReferences(t *testing.T) {
	old := []byte(`{"Ranges":null,"Groups":null,"Doubtful":0.002,"Calendar":"weekdays","Assigned":{"alder":"equity"}}`)
	s, err := ParseSettings(old)
	if err != nil || s.Assigned["alder"] != "equity" || s.References != nil || s.Events != nil {
		t.Fatalf("%+v, %v", s, err)
	}
	if got := s.Text(); !bytes.Equal(got, old) {
		t.Errorf("%s, want %s", got, old)
	}
}

// The order of the events' file says nothing; the settings are left as they are.
func TestEventsInAnyOrder(t *testing.T) {
	one, two := Event{Date: 3, Series: "b", Kind: "split", Amount: 2}, Event{Date: 3, Series: "a", Kind: "distribution", Amount: 0.01}
	x, y := Settings{Events: []Event{one, two}}, Settings{Events: []Event{two, one}}
	if !bytes.Equal(x.Text(), y.Text()) {
		t.Errorf("%s and %s", x.Text(), y.Text())
	}
	if x.Events[0] != one {
		t.Error("the events were put in another order")
	}
	back, err := ParseSettings(x.Text())
	if err != nil || len(back.Events) != 2 || back.Events[0] != two {
		t.Errorf("%+v, %v", back, err)
	}
}
