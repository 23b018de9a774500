package ledger

import (
	"fmt"

	"strayd/rules"
)

// What people did stands twice: as an entry of the chained record, and on the rows of the flags that it was about. The record is walked
// first; then every row of a flag must say what the record says, and every entry must be found on its flags.

// decision notes an entry of the record that is about flags.
func (c *verifier) decision(key []byte, e *Entry) error {
	entry, err := rules.ParseEntry(e.Body)
	if err != nil {
		return malformed(inRecord, key, err.Error())
	}
	if e.Who != entry.By.String() {
		return malformed(inRecord, key, "who acted stands there in two ways")
	}
	if entry.Step <= c.actedAt || entry.Step > c.v.head.step {
		return malformed(inRecord, key, fmt.Sprintf("step %d is not after that of the entry before, or is not published", entry.Step))
	}
	c.actedAt = entry.Step
	entry.At = e.At
	c.acts[entry.Step] = entry
	c.toMeet += uint64(len(entry.Refs))
	return nil
}

// acted holds what one row of a flag says of people against the record.
func (c *verifier) acted(key []byte, f *rules.Flag) error {
	for _, a := range []*rules.Act{f.Last, f.Decided} {
		if a == nil {
			continue
		}
		entry := c.acts[a.Step]
		if entry == nil {
			return malformed(inFlags, key, fmt.Sprintf("the record does not have what %s did", a.By))
		}
		if of, ok := entry.Of(f.Ref); !ok || !of.Same(a) {
			return malformed(inFlags, key, fmt.Sprintf("what %s did is not what the record says", a.By))
		}
	}
	if !c.follows(f, stepOf(key)) {
		return malformed(inFlags, key, fmt.Sprintf("its standing, %s, does not follow from the record", f.Standing))
	}
	return nil
}

// follows says whether the standing of a row follows from what it says that people did. A row of a later step is the program's: a
// restatement or the end of a waiver opens the flag again.
func (c *verifier) follows(f *rules.Flag, step uint32) bool {
	switch {
	case f.Last == nil:
		return f.Decided == nil && (f.Standing == rules.Open || f.Standing == rules.Reopened || f.Standing == rules.OfHistory)
	case f.Last.Step < step:
		return f.Standing == f.Last.To() || f.Standing == rules.Reopened
	}
	c.met++
	return f.Standing == f.Last.To() && (f.Standing != rules.Decided || f.Decided != nil && f.Decided.Step == step)
}
