package health

import (
	"context"
	"log/slog"
	"net/http"
	"strings"
	"time"
	"unicode"
)

// Options are how the pages are answered. The zero value works.
type Options struct {
	Stale time.Duration // how old the last beat may be; 2 minutes when 0
	Log   *slog.Logger  // told of a Report that panics; nobody when nil
}

const (
	// answerTime bounds how long a page may take, so that a daemon that hangs is answered for with 503.
	answerTime = 5 * time.Second
	// atOnce bounds how many pages are made at the same time; further ones are refused.
	atOnce = 8
)

const (
	plainText   = "text/plain; charset=utf-8"
	jsonText    = "application/json"
	metricsText = "application/openmetrics-text; version=1.0.0; charset=utf-8"
)

// answer is what a page says.
type answer struct {
	status int
	kind   string // content type
	body   []byte
}

// Handler answers the pages. It calls report for each of them, from many goroutines; a report that does not come in time is
// answered for with 503.
func Handler(report func() Report, o Options) http.Handler {
	if o.Stale == 0 {
		o.Stale = staleAfter
	}
	if o.Log == nil {
		o.Log = slog.New(slog.DiscardHandler)
	}
	h := http.Handler(pages(report, o.Stale))
	h = few(h)
	h = http.TimeoutHandler(h, answerTime, "no answer in time\n")
	h = calm(h, o.Log)
	return guard(h)
}

func pages(report func() Report, stale time.Duration) http.HandlerFunc {
	all := map[string]func(*look) answer{
		"/alive":   alivePage,
		"/ready":   readyPage,
		"/healthy": healthyPage,
		"/state":   statePage,
		"/metrics": metricsPage,
	}
	return func(w http.ResponseWriter, r *http.Request) {
		page, ok := all[r.URL.Path]
		if !ok {
			refuse(w, http.StatusNotFound, "no such page; there are /alive, /ready, /healthy, /state and /metrics")
			return
		}
		a := page(lookAt(report(), stale))
		w.Header().Set("Content-Type", a.kind)
		w.WriteHeader(a.status)
		w.Write(a.body) //nolint:errcheck // whoever asked has gone
	}
}

func alivePage(l *look) answer {
	if !l.alive {
		return yesOrNo("alive", l.troubles[:1])
	}
	return yesOrNo("alive", nil)
}

func readyPage(l *look) answer   { return yesOrNo("ready", l.unready) }
func healthyPage(l *look) answer { return yesOrNo("healthy", l.troubles) }

// yesOrNo says the word, or that it is not so and why.
func yesOrNo(word string, whyNot []string) answer {
	if len(whyNot) == 0 {
		return answer{http.StatusOK, plainText, []byte(word + "\n")}
	}
	var b strings.Builder
	b.WriteString("not " + word + "\n")
	for _, why := range whyNot {
		b.WriteString(oneLine(why) + "\n")
	}
	return answer{http.StatusServiceUnavailable, plainText, []byte(b.String())}
}

func statePage(l *look) answer {
	body, err := l.state()
	if err != nil {
		panic(err) // plain values always have a text
	}
	return answer{http.StatusOK, jsonText, append(body, '\n')}
}

func metricsPage(l *look) answer { return answer{http.StatusOK, metricsText, l.metrics()} }

// oneLine takes out what would break a line or steer a terminal.
func oneLine(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) || unicode.Is(unicode.Cf, r) {
			return ' '
		}
		return r
	}, s)
}

// few lets only so many requests in at once: those that hang do not pile up.
func few(h http.Handler) http.Handler {
	room := make(chan struct{}, atOnce)
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		select {
		case room <- struct{}{}:
			defer func() { <-room }()
			h.ServeHTTP(w, r)
		default:
			refuse(w, http.StatusServiceUnavailable, "too many requests at once")
		}
	})
}

// calm turns a panic into a bare answer.
func calm(h http.Handler, log *slog.Logger) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		defer func() {
			if p := recover(); p != nil {
				log.LogAttrs(context.Background(), slog.LevelError, "a health page failed", slog.String("page", r.URL.Path), slog.Any("panic", p))
				refuse(w, http.StatusInternalServerError, "the page could not be made")
			}
		}()
		h.ServeHTTP(w, r)
	})
}

func refuse(w http.ResponseWriter, status int, text string) {
	w.Header().Set("Content-Type", plainText)
	w.WriteHeader(status)
	w.Write([]byte(text + "\n")) //nolint:errcheck // whoever asked has gone
}
