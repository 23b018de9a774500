package watcher

import (
	"errors"

	"strayd/rules"
)

// blank is a ledger that holds nothing but numbers for ranges, and takes nothing: what is judged against it is judged as a first load.
type blank struct{ ranges []RangeKey }

var errBlank = errors.New("a back-run writes nothing")

// View and the methods after it make it a Store.
func (b *blank) View() (View, error) { return b, nil }

func (b *blank) Publish(*Batch) error  { return errBlank }
func (b *blank) EndPass(PassRow) error { return errBlank }

// Close and the methods after it make it a View.
func (b *blank) Close() error { return nil }

func (b *blank) Step() uint32                                                   { return 0 }
func (b *blank) AsOf(uint32) View                                               { return b }
func (b *blank) NextRef() uint64                                                { return 1 }
func (b *blank) Names() (*Names, error)                                         { return NewNames(nil, nil), nil }
func (b *blank) Dates(What) ([]rules.Date, error)                               { return nil, nil }
func (b *blank) Series(What, uint32) ([]Version, error)                         { return nil, nil }
func (b *blank) Used(uint16, uint32) ([]Version, error)                         { return nil, nil }
func (b *blank) State(uint16, uint32) (*State, error)                           { return nil, nil }
func (b *blank) File(uint32) (FileRow, error)                                   { return FileRow{}, errBlank }
func (b *blank) Files(func(FileRow) bool) error                                 { return nil }
func (b *blank) LastPass() (PassRow, bool, error)                               { return PassRow{}, false, nil }
func (b *blank) Head() (string, error)                                          { return "", nil }
func (b *blank) Ranges() ([]RangeKey, error)                                    { return b.ranges, nil }
func (b *blank) Settings(uint32) ([]byte, error)                                { return nil, errBlank }
func (b *blank) LastSettings() (uint32, error)                                  { return 0, nil }
func (b *blank) Flag(uint64) (rules.Flag, bool, error)                          { return rules.Flag{}, false, nil }
func (b *blank) FlagPast(uint64) ([]FlagVersion, error)                         { return nil, nil }
func (b *blank) Flags(bool, func(rules.Flag) bool) error                        { return nil }
func (b *blank) FlagsOf(bool, func(FlagHead) bool, func(rules.Flag) bool) error { return nil }
func (b *blank) Marked(rules.Date, uint32) ([]int, error)                       { return nil, nil }
func (b *blank) GroupScales(uint16, string) ([]GroupScale, error)               { return nil, nil }

func (b *blank) Fill(What, rules.Date, uint32, int, []int64) (bool, error) { return false, nil }
func (b *blank) Patch(uint16, rules.Date, uint32, int, []int64) error      { return nil }
func (b *blank) Layers(What, rules.Date, uint32, func(uint32, []int64) error) error {
	return nil
}
func (b *blank) FileSeen(string, [32]byte, string) (FileRow, bool, error) {
	return FileRow{}, false, nil
}
func (b *blank) FlagAt(uint32, rules.Date, rules.Kind) (rules.Flag, bool, error) {
	return rules.Flag{}, false, nil
}

// numbered gives every definition of the settings a number.
func numbered(s *rules.Settings, terms bool) *blank {
	keys := []string{concludedKey, residualKey}
	if terms {
		keys = append(keys, termsKey)
	}
	for n := range s.Ranges {
		keys = append(keys, s.Identity(n))
	}
	b := &blank{}
	for n, key := range keys {
		b.ranges = append(b.ranges, RangeKey{uint16(n + 1), key})
	}
	return b
}
