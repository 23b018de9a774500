package watcher

import (
	"strayd/rules"
	"strayd/rules/causes"
)

// known is what a pool is told of a value of which somebody decided something.
func known(member int, decided *rules.Act, x rules.Units) causes.Known {
	k := causes.Known{Member: member, Use: causes.AsIs}
	switch {
	case decided.Uses(x) == rules.Missing:
		k.Use = causes.Out
	case decided.Conclusion == rules.Corrected:
		k.Use, k.Value = causes.Instead, decided.Value
	}
	return k
}

// Decided is what somebody decided of an observation as it stands, nil for nothing.
func (r *Reader) Decided(series string, date rules.Date) (*rules.Act, error) {
	id, ok := r.Names.Find([]byte(series))
	if !ok {
		return nil, &UnknownSeries{series}
	}
	steps, err := versionSteps(r.View, date, id/BlockSize, []int{int(id % BlockSize)})
	if err != nil {
		return nil, err
	}
	about, err := aboutValue(r.View, id, date, steps[0])
	return about.decided, err
}
