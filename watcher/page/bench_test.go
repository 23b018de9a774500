package page

import (
	"fmt"
	"net/http"
	"net/http/httptest"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// manyFlags is a reading with a thousand open flags in a hundred groups.
type manyFlags struct{ oneFlag }

func (manyFlags) Flags(_ bool, each func(rules.Flag) bool) error {
	for n := range 1000 {
		each(rules.Flag{Ref: uint64(n + 1), Date: 20524, RaisedAt: time.Unix(1773000000, 0), Series: fmt.Sprintf("fund-%04d", n), Group: fmt.Sprintf("group-%02d", n/10),
			Kind: rules.KindBreach, Return: rules.One / 10, Low: rules.Some(-0.01), High: rules.Some(0.01), Tail: rules.Some(1e-4), Log10: rules.Some(-4),
			LooksLike: rules.CauseX10, Share: rules.Some(0.9), Implied: rules.Some(0.01), Standing: rules.Open})
	}
	return nil
}

// The first page with a thousand open flags, written anew each time.
func BenchmarkToday(b *testing.B) {
	s := newStand(b)
	s.src.View = func() (watcher.View, error) { return manyFlags{}, nil }
	path, cookie, _ := s.enter(ada)
	h := s.Handler()
	for b.Loop() {
		r := httptest.NewRequest("GET", "http://127.0.0.1:9"+path+"/", nil)
		r.AddCookie(&http.Cookie{Name: cookieName, Value: cookie})
		w := httptest.NewRecorder()
		h.ServeHTTP(w, r)
		if w.Code != http.StatusOK {
			b.Fatal(w.Code)
		}
	}
}
