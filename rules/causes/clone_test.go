package causes

import (
	"fmt"
	"math/rand/v2"
	"reflect"
	"testing"

	"strayd/rules"
)

// cloneDays are days of a pool with a benchmark, peers, and now and then a value a hundred times too large or missing.
func cloneDays(seed uint64, days, members int) (out []Day) {
	random := rand.New(rand.NewPCG(seed, 1))
	for t := range days {
		d := Day{Date: rules.Date(19_000 + t/5*7 + t%5)}
		market := random.NormFloat64()
		for range members {
			u := rules.Units((market+0.2*random.NormFloat64())*100) * (rules.One / 10_000)
			switch random.IntN(200) {
			case 0:
				u *= 100
			case 1:
				u = rules.Missing
			}
			d.Values = append(d.Values, u)
		}
		out = append(out, d)
	}
	return out
}

func clonePool(members int) *Pool {
	var of []Member
	for i := range members {
		m := Member{ID: fmt.Sprint("m", i), Group: 0, FX: -1, Reference: Reference{Kind: Peers}}
		switch {
		case i == 0:
			m = Member{ID: "index", Group: -1, FX: -1}
		case i%2 == 0:
			m.Reference = Reference{Kind: Series, Series: 0}
		}
		of = append(of, m)
	}
	return NewPool(of, []string{"g"}, 0.002)
}

// A clone goes on as its original would have, whatever the original goes through meanwhile.
func TestCloneGoesOnAlone(t *testing.T) {
	const members = 12
	for seed := range uint64(3) {
		days := cloneDays(seed, 200, members)
		alone, whole := clonePool(members), clonePool(members)
		for _, d := range days[:150] {
			alone.Step(d)
			whole.Step(d)
		}
		clone := whole.Clone()
		for _, d := range cloneDays(seed+100, 200, members)[150:] {
			whole.Step(d)
		}
		for _, d := range days[150:] {
			if got, want := clone.Step(d), alone.Step(d); !sameResult(got, want) {
				t.Fatalf("seed %d, %s: %+v, want %+v", seed, d.Date, got, want)
			}
		}
	}
}

// sameResult compares as text, since a result may hold figures that are absent.
func sameResult(a, b *Result) bool { return fmt.Sprintf("%+v", a) == fmt.Sprintf("%+v", b) }

// Nothing that changes is shared: every slice, map and pointer within a clone lies elsewhere, but for what NewPool makes once.
func TestCloneSharesNothingThatChanges(t *testing.T) {
	const members = 12
	p := clonePool(members)
	for _, d := range cloneDays(1, 120, members) {
		p.Step(d)
	}
	fixed := map[string]bool{".members": true, ".groups": true, ".peers": true, ".benchmarks": true, ".followers": true, ".isReference": true}
	var walk func(path string, a, b reflect.Value)
	walk = func(path string, a, b reflect.Value) {
		if fixed[path] {
			return
		}
		switch a.Kind() {
		case reflect.Struct:
			for i := range a.NumField() {
				walk(path+"."+a.Type().Field(i).Name, a.Field(i), b.Field(i))
			}
		case reflect.Array:
			for i := range a.Len() {
				walk(path, a.Index(i), b.Index(i))
			}
		case reflect.Slice:
			if a.Cap() > 0 && b.Cap() > 0 && a.Pointer() == b.Pointer() {
				t.Fatalf("%s is shared", path)
			}
			for i := range min(a.Len(), b.Len()) {
				walk(path, a.Index(i), b.Index(i))
			}
		case reflect.Map, reflect.Pointer:
			if !a.IsNil() && a.Pointer() == b.Pointer() {
				t.Fatalf("%s is shared", path)
			}
		}
	}
	walk("", reflect.ValueOf(p).Elem(), reflect.ValueOf(p.Clone()).Elem())
}
