package rules

import (
	"fmt"
	"slices"
	"strings"
	"time"
)

// Person is who acted, as the operating system knows them.
type Person struct {
	UID  int
	Name string // "" where the system has no name for the uid
}

// Root says that the person acted as the system's administrator, so that it may be anybody who has that right.
func (p Person) Root() bool { return p.UID == 0 }

// String is the name with the uid.
func (p Person) String() string {
	if p.Name == "" {
		return fmt.Sprintf("uid %d", p.UID)
	}
	return fmt.Sprintf("%s (uid %d)", p.Name, p.UID)
}

// Deed is what a person did about a flag.
type Deed string

// The deeds, in the order of their numbers in the ledger: only append.
const (
	Acknowledge Deed = "acknowledge"
	Decide      Deed = "decide"
	Waive       Deed = "waive"
	SignOff     Deed = "sign-off"
	Accept      Deed = "accept" // a refused file is released
)

// Deeds lists every deed in order.
var Deeds = []Deed{Acknowledge, Decide, Waive, SignOff, Accept}

// Conclusion is what a person decided of a flag.
type Conclusion string

// The conclusions, in the order of their numbers in the ledger: only append.
const (
	Genuine   Conclusion = "genuine"   // the value is right: windows take it in full
	Erroneous Conclusion = "error"     // it is wrong, and no better one is known: windows leave it out
	Corrected Conclusion = "corrected" // it is wrong: windows take another value in its place
)

// Conclusions lists every conclusion in order.
var Conclusions = []Conclusion{Genuine, Erroneous, Corrected}

// Reason is why a flag was decided as it was.
type Reason string

// The reasons, in the order of their numbers in the ledger: only append.
const (
	MarketMove      Reason = "market move"
	PortfolioEvent  Reason = "portfolio event"
	CorporateAction Reason = "corporate action"
	ForDistribution Reason = "distribution"
	DataError       Reason = "data error"
	KnownEvent      Reason = "known event"
	Unexplained     Reason = "unexplained"
)

// Reasons lists every reason in order.
var Reasons = []Reason{MarketMove, PortfolioEvent, CorporateAction, ForDistribution, DataError, KnownEvent, Unexplained}

// ParseReason reads a reason; hyphens may stand for its blanks.
func ParseReason(s string) (Reason, error) {
	r := Reason(strings.ReplaceAll(strings.ToLower(strings.TrimSpace(s)), "-", " "))
	if !slices.Contains(Reasons, r) {
		var words []string
		for _, r := range Reasons {
			words = append(words, string(r))
		}
		return "", fmt.Errorf("reason %q: need one of %s", s, strings.Join(words, ", "))
	}
	return r, nil
}

// Act is one thing that one person did about one or several flags. It is an entry of the record.
type Act struct {
	Deed       Deed
	Step       uint32 // the step that recorded it
	By         Person
	At         time.Time
	Conclusion Conclusion // of decide, else ""
	Value      Units      // the corrected value, Missing where there is none
	Reason     Reason     // "" where none was given
	Note       string
	Override   string // why a market move is the reason although the residual does not say so
	Until      Date   // of waive, and of the sign-off of a waiver: the last day on which the flag asks nothing of anyone; else NoDate
	Second     bool   // the group asks for four eyes: another person than who decides or waives must sign off
}

// Same says that two acts are one and the same.
func (a *Act) Same(b *Act) bool {
	x, y := *a, *b
	x.At, y.At = time.Time{}, time.Time{}
	return x == y && a.At.Equal(b.At)
}

// Check says what is wrong with an act before any flag is looked at.
func (a *Act) Check() error {
	if a.Deed != Decide {
		return nil
	}
	switch {
	case !slices.Contains(Conclusions, a.Conclusion):
		return fmt.Errorf("conclusion %q: need genuine, error or corrected", a.Conclusion)
	case (a.Value != Missing) != (a.Conclusion == Corrected):
		return fmt.Errorf("a value goes with corrected, and with nothing else")
	case a.Value != Missing && !InWindow(a.Value):
		return fmt.Errorf("corrected value %s is beyond +-%d", a.Value, WindowLimit/One)
	case a.Reason == "", a.Note == "":
		return fmt.Errorf("a decision needs a reason and a note")
	case a.Conclusion == Genuine && a.Reason == DataError:
		return fmt.Errorf("a value that is genuine is no data error")
	case a.Conclusion != Genuine && a.Reason == MarketMove:
		return fmt.Errorf("a value that is wrong is no market move")
	case a.Override != "" && a.Reason != MarketMove:
		return fmt.Errorf("only a market move is overridden")
	}
	return nil
}

// Uses is what windows take of a return that the act decided: Missing where they leave it out.
func (a *Act) Uses(x Units) Units {
	switch {
	case a.Conclusion == Erroneous:
		return Missing
	case a.Conclusion == Corrected:
		x = a.Value
	}
	if !InWindow(x) {
		return Missing
	}
	return x
}

// Words say in short what was decided.
func (a *Act) Words() string {
	if a.Conclusion == Corrected {
		return "corrected to " + InPercent(a.Value.Float())
	}
	return string(a.Conclusion)
}
