package causes

import (
	"math"
	"slices"
	"testing"

	"strayd/rules"
)

// On a day of -4 deviations there is one event a group, with the member that stood still and the flipped one as those that did not take part;
// the others need no flag.
func TestMarketDay(t *testing.T) {
	for seed := range uint64(6) {
		s := newScene(seed)
		values := s.day(-0.04, 0.001)
		values[onIndex+4], values[onIndex+7] = 0, -values[onIndex+7]
		r := s.step(values)
		if len(r.Markets) != 1 || r.Markets[0].Group != 0 {
			t.Fatalf("seed %d: markets %+v, want one, of group 0", seed, r.Markets)
		}
		m := r.Markets[0]
		if m.Reporting != fundsOf || m.Median > -0.03 || m.MedianZ < watchZ || !slices.Equal(m.NotMoved, []int{onIndex + 4}) ||
			!slices.Equal(m.Otherwise, []int{onIndex + 7}) {
			t.Errorf("seed %d: %+v", seed, m)
		}
		for i := range fundsOf {
			v := viewOf(r.Views, onIndex+i)
			odd := i == 4 || i == 7
			if odd != (v.Kind != "") || !odd && math.Abs(v.OwnZ) > watchZ && (!v.Explained || v.LooksLike != rules.CauseMarket) {
				t.Errorf("seed %d, fund %d: %+v", seed, i, v)
			}
		}
	}
}

// A benchmark that is off by 2 % is found by its followers, with the return that it should have had, and they are not blamed for it.
func TestWrongReference(t *testing.T) {
	for seed := range uint64(6) {
		s := newScene(seed)
		values := s.day(0.005, 0.005)
		values[0] = nearest(0.025, 6)
		r := s.step(values)
		if len(r.Wrong) != 1 || r.Wrong[0].Member != 0 || r.Wrong[0].Followers != fundsOf || math.Abs(r.Wrong[0].Implied.V-0.005) > 0.001 {
			t.Fatalf("seed %d: %+v, want the index and about 0.005", seed, r.Wrong)
		}
		for _, v := range r.Views {
			if v.Member != 0 && v.Kind != "" {
				t.Errorf("seed %d: %+v", seed, v)
			}
		}
		if r = s.step(s.day(0.005, 0.005)); len(r.Wrong) != 0 {
			t.Errorf("seed %d: still wrong a day later", seed)
		}
	}
}

// A benchmark that departs for good is wrong for three days, then it is the relation that has changed.
func TestReferenceThatChangesForGood(t *testing.T) {
	s := newScene(1)
	wrong := 0
	for range 20 {
		values := s.day(s.random.NormFloat64()*0.01, 0)
		values[0] = nearest(s.random.NormFloat64()*0.01, 6)
		wrong += len(s.step(values).Wrong)
	}
	if wrong < 1 || wrong > 2*mostWrong {
		t.Errorf("%d days of 20", wrong)
	}
}

// A file with the values of the day before is found whole, members with peers included, since they come by the same feed.
func TestFileADayLate(t *testing.T) {
	for seed := range uint64(6) {
		s := newScene(seed)
		s.step(s.day(0.012, -0.01))
		values := slices.Clone(s.last)
		values[0] = nearest(-0.008, 6)
		r := s.step(values)
		if len(r.Shifted) != 2*fundsOf || len(r.Wrong) != 0 {
			t.Errorf("seed %d: %d shifted, wrong %+v", seed, len(r.Shifted), r.Wrong)
		}
		for _, v := range r.Views {
			if v.LooksLike == rules.CauseShifted && (v.Kind != "" || v.Use != Out) {
				t.Errorf("seed %d: %+v", seed, v)
			}
		}
		if r = s.step(s.day(0.003, 0.01)); len(r.Shifted) != 0 {
			t.Errorf("seed %d: still shifted", seed)
		}
	}
}

// A true move of 6 deviations is genuine or has no name, and looks like no error.
func TestTrueMoveIsNoError(t *testing.T) {
	blamed := 0
	for seed := range uint64(20) {
		s := newScene(seed)
		values := s.day(0.003, -0.002)
		values[withPeer+2] += 6e13 + 123e9
		v := viewOf(s.step(values).Views, withPeer+2)
		if v.LooksLike != "" && v.LooksLike != rules.CauseGenuine {
			blamed++
		}
	}
	if blamed > 1 { // the floor is 5 in 100
		t.Errorf("%d of 20 moves look like an error", blamed)
	}
}

// A member that starts when its group is there is judged at once by the group's scale: a value ten times the group's size is far out, an
// ordinary one is not.
func TestNewMemberBorrowsItsGroupsScale(t *testing.T) {
	s := newScene(2)
	anew := NewPool(s.members, []string{"one", "two"}, 0.002)
	var last *Result
	date := s.date
	for n := range 130 {
		values := s.day(s.random.NormFloat64()*0.01, s.random.NormFloat64()*0.01)
		if n < 128 {
			values[onIndex] = rules.Missing
		}
		if n == 129 {
			values[onIndex] = nearest(values[onIndex].Float()+0.1, 6)
		}
		last = anew.Step(Day{Date: date + rules.Date(n/5*7+n%5), Values: values})
	}
	if v := viewOf(last.Views, onIndex); math.Abs(v.OwnZ) < 5 {
		t.Errorf("10 %% on the second day of a series in a group of 1 %%: %+v", v)
	}
}
