package ledger

import (
	"encoding/hex"
	"math/rand/v2"
	"reflect"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

func codedFlag() rules.Flag {
	return rules.Flag{Ref: 7, Step: 3, RaisedAt: time.Date(2026, 3, 13, 18, 30, 0, 0, time.UTC), Date: 20525, Group: "equity", Kind: rules.KindBreach,
		Range: "own", Return: -41200000000000, Low: rules.Some(-0.019), High: rules.Some(0.02), Z: rules.Some(-9.3), Tail: rules.Some(1e-7),
		Log10: rules.Some(-7), Standing: rules.Open, Feed: "admin", File: "a.csv", Line: 18, Note: "x"}
}

// The bytes were written by the program before flags had causes.
func TestFlagsOfBeforeCausesAreRead(t *testing.T) {
	old, err := hex.DecodeString("bf06000003dac0020506657175697479036f776edbf97e6abc7493bf7b14ae47e17a943f9a999999999922c048afbc9af2d77a3e0000000000001cc0" +
		"ffffeaf593de120561646d696e05612e63737680c0d4839886bd9c31120178")
	if err != nil {
		t.Fatal(err)
	}
	got, ok := unpackFlag(7, old)
	if want := codedFlag(); !ok || got.series != 4 || !reflect.DeepEqual(got.flag, want) {
		t.Errorf("%v %d %+v, want %+v", ok, got.series, got.flag, want)
	}
}

// Whatever parts of a flag are absent, it comes back as it was; and a row that is cut short or runs on is refused.
func TestFlagCode(t *testing.T) {
	seed := uint64(time.Now().UnixNano())
	t.Logf("seed %d", seed)
	r := rand.New(rand.NewPCG(seed, 1))
	for range 2000 {
		f := codedFlag()
		for _, n := range append(figures(&f), weights(&f)...) {
			*n.num = rules.Num{}
			if r.IntN(2) == 0 {
				*n.num = rules.Some(r.NormFloat64())
			}
		}
		if r.IntN(2) == 0 {
			f.LooksLike = rules.Causes[r.IntN(len(rules.Causes))]
		}
		f.Reference = []string{"", "peers", "index\u00a0x"}[r.IntN(3)]
		f.Note = []string{"", "a note"}[r.IntN(2)]
		row := rowOf(&f, 4, 3, &watcher.FileRow{})
		packed := packFlag(nil, &row)
		got, ok := unpackFlag(f.Ref, packed)
		if !ok || !reflect.DeepEqual(got.flag, f) {
			t.Fatalf("%+v came back as %+v, %v", f, got.flag, ok)
		}
		if _, ok := unpackFlag(f.Ref, packed[:r.IntN(len(packed))]); ok {
			t.Fatalf("%+v: a row that is cut short is taken", f)
		}
		if _, ok := unpackFlag(f.Ref, append(packed, 0)); ok {
			t.Fatalf("%+v: a row that runs on is taken", f)
		}
	}
}
