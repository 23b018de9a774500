package health

import (
	"bytes"
	"log/slog"
	"net/http"
	"net/http/httptest"
	"strings"
	"sync/atomic"
	"testing"
	"testing/synctest"
	"time"
)

func pagesOf(r Report) http.Handler { return Handler(func() Report { return r }, Options{}) }

// A name that another site points at this machine is not a name of this machine.
func TestHost(t *testing.T) {
	for host, want := range map[string]int{
		"127.0.0.1": 200, "127.0.0.1:9190": 200, "127.8.9.10:1": 200, "localhost": 200, "localhost:9190": 200, "LocalHost:9190": 200,
		"localhost.": 200, "localhost.:9190": 200, "[::1]": 200, "[::1]:9190": 200, "[::ffff:127.0.0.1]:9190": 200,
		"": 421, ":9190": 421, "example.org": 421, "example.org:9190": 421, "localhost.example.org": 421, "127.0.0.1.example.org": 421,
		"evil-localhost": 421, "127.0.0.1@example.org": 421, "example.org#127.0.0.1": 421, "0.0.0.0:9190": 421, "10.0.0.1:9190": 421,
		"[::]:9190": 421, "[fe80::1]:9190": 421, "2130706433": 421, "0x7f.1": 421, "127.1": 421, "0177.0.0.1": 421, "[::ffff:10.0.0.1]:9190": 421,
	} {
		req := httptest.NewRequest(http.MethodGet, "/state", nil)
		req.Host = host
		if w := answered(pagesOf(sound()), req); w.Code != want || (want != 200 && strings.Contains(w.Body.String(), "ledger")) {
			t.Errorf("Host %q: %d, want %d", host, w.Code, want)
		}
	}
}

func TestMethodsAndOrigins(t *testing.T) {
	for _, c := range []struct {
		method, header, value string
		want                  int
	}{
		{"GET", "", "", 200},
		{"HEAD", "", "", 200},
		{"POST", "", "", 405},
		{"PUT", "", "", 405},
		{"DELETE", "", "", 405},
		{"OPTIONS", "", "", 405},
		{"TRACE", "", "", 405},
		{"CONNECT", "", "", 405},
		{"get", "", "", 405},
		{"GET", "Sec-Fetch-Site", "none", 200},
		{"GET", "Sec-Fetch-Site", "same-origin", 200},
		{"GET", "Sec-Fetch-Site", "same-site", 403},
		{"GET", "Sec-Fetch-Site", "cross-site", 403},
		{"GET", "Sec-Fetch-Site", "anything", 403},
		{"GET", "Origin", "http://127.0.0.1:9190", 200},
		{"GET", "Origin", "http://127.0.0.1:9191", 403}, // another page of this machine is another origin
		{"GET", "Origin", "https://127.0.0.1:9190", 403},
		{"GET", "Origin", "https://example.org", 403},
		{"GET", "Origin", "null", 403},
	} {
		req := httptest.NewRequest(http.MethodGet, "/state", nil)
		req.Method, req.Host = c.method, "127.0.0.1:9190"
		if c.header != "" {
			req.Header.Set(c.header, c.value)
		}
		w := answered(pagesOf(sound()), req)
		if w.Code != c.want || (c.want != 200 && strings.Contains(w.Body.String(), "ledger")) {
			t.Errorf("%s with %s %q: %d, want %d", c.method, c.header, c.value, w.Code, c.want)
		}
		if allow := w.Header().Get("Allow"); (c.want == 405) != (allow == "GET, HEAD") {
			t.Errorf("%s: Allow %q", c.method, allow)
		}
	}
}

func TestNoOtherPages(t *testing.T) {
	for _, path := range []string{"/", "//alive", "/alive/", "/Alive", "/state.json", "/debug/pprof/", "/../etc/passwd", "/%2e%2e/etc/passwd", "/alive/../state", "/favicon.ico"} {
		if w := get(sound(), path); w.Code != http.StatusNotFound || w.Header().Get("Location") != "" {
			t.Errorf("%s: %d, %v", path, w.Code, w.Header())
		}
	}
}

// A panic is told to the log, and nothing of it to whoever asked.
func TestPanic(t *testing.T) {
	var log bytes.Buffer
	h := Handler(func() Report { panic("the cat is in the bag") }, Options{Log: slog.New(slog.NewJSONHandler(&log, nil))})
	req := httptest.NewRequest(http.MethodGet, "/state", nil)
	req.Host = "localhost"
	w := answered(h, req)
	if w.Code != http.StatusInternalServerError || w.Body.String() != "the page could not be made\n" {
		t.Errorf("%d %q", w.Code, w.Body)
	}
	if got := log.String(); !strings.Contains(got, "the cat is in the bag") || strings.Contains(got, ".go:") {
		t.Errorf("the log says %q", got)
	}
}

// A daemon that hangs is answered for, those who ask do not pile up, and when it goes on, so do the pages.
func TestReportThatHangs(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		var hanging atomic.Int32
		free := make(chan struct{})
		h := Handler(func() Report { hanging.Add(1); <-free; return sound() }, Options{})
		var codes [503 + 1]atomic.Int32
		began := time.Now()
		for range 100 {
			go func() {
				req := httptest.NewRequest(http.MethodGet, "/alive", nil)
				req.Host = "localhost"
				codes[answered(h, req).Code].Add(1)
			}()
		}
		time.Sleep(answerTime + time.Millisecond) // in the bubble's time
		synctest.Wait()
		if n, bad := hanging.Load(), codes[503].Load(); n != atOnce || bad != 100 {
			t.Errorf("after %v, %d reports hang, want %d; %d answers of 503, want 100", time.Since(began), n, atOnce, bad)
		}
		close(free)
		synctest.Wait() // the bubble fails at its end when one of them is left
		req := httptest.NewRequest(http.MethodGet, "/alive", nil)
		req.Host = "localhost"
		if w := answered(h, req); w.Code != 200 {
			t.Errorf("afterwards: %d %q", w.Code, w.Body)
		}
	})
}

func FuzzNames(f *testing.F) {
	f.Add("desk")
	f.Add("a\"} 1\n# EOF\n\\")
	f.Add("\xff\x00\u2028")
	figures := bytes.Count(lookAt(sound(), staleAfter).metrics(), []byte("\nstrayd_"))
	f.Fuzz(func(t *testing.T, name string) {
		r := sound()
		r.Jobs[0].Name, r.Channels[0].Name, r.Feeds[0].Name, r.Version = name, name, name, name
		got, err := readMetrics(string(lookAt(r, staleAfter).metrics()))
		if err != nil || len(got.values) != figures {
			t.Errorf("%q: %v, want %d figures", name, err, figures)
		}
	})
}
