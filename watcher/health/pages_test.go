package health

import (
	"encoding/json"
	"fmt"
	"maps"
	"net/http"
	"net/http/httptest"
	"reflect"
	"slices"
	"strings"
	"testing"
	"time"

	"strayd/rules"
)

var noon = time.Date(2026, 3, 13, 12, 0, 0, 0, time.UTC)

// sound is a report of a daemon that nothing is wrong with.
func sound() Report {
	return Report{
		Version: "1.2.3", Started: noon.Add(-26 * time.Hour), Now: noon, Beat: noon.Add(-20 * time.Second),
		Ledger:        Ledger{Open: true, Path: "/books/ledger.db", Step: 41, Bytes: 1 << 20, Series: 12},
		Configuration: Configuration{Valid: true, Hash: "c0ffee"},
		Jobs: []Job{{Name: "administrator", LastSlot: noon.Add(-10 * time.Minute), Outcome: "done", NextSlot: noon, Every: 10 * time.Minute,
			Runs: 7, Failed: 2, Panics: 1, Missed: 3, Coalesced: 4}},
		Channels: []Channel{{Name: "desk", State: ChannelOK, Waiting: 2, Failed: 1, Oldest: noon.Add(-time.Minute)}},
		Feeds:    []Feed{{Name: "administrator", File: "2026-03-12.csv", Date: day("2026-03-12"), At: noon.Add(-time.Hour)}, {Name: "prices"}},
		Pass: Pass{Number: 9, Started: noon.Add(-10 * time.Minute), Ended: noon.Add(-10*time.Minute + 60*time.Millisecond), Accepted: 1, Refused: 2, Waiting: 3,
			Verdicts: map[rules.Finding]int{rules.Inside: 10, rules.Breach: 1, rules.NotJudged: 1}, Flags: map[rules.Kind]int{rules.KindBreach: 1}},
		OpenFlags:  map[rules.Kind]int{rules.KindBreach: 2, rules.KindMarketDay: 1},
		ClockSteps: 1,
	}
}

func day(s string) rules.Date {
	d, err := rules.ParseDate(s)
	if err != nil {
		panic(err)
	}
	return d
}

// get asks the pages of a report, as a program on this machine does.
func get(r Report, path string) *httptest.ResponseRecorder {
	req := httptest.NewRequest(http.MethodGet, path, nil)
	req.Host = "127.0.0.1:9190"
	return answered(Handler(func() Report { return r }, Options{}), req)
}

func answered(h http.Handler, req *http.Request) *httptest.ResponseRecorder {
	w := httptest.NewRecorder()
	h.ServeHTTP(w, req)
	return w
}

// Each row changes one thing of a sound daemon and says which pages then refuse, and why.
func TestPagesRefuseForTheirOwnReasons(t *testing.T) {
	for _, c := range []struct {
		name    string
		change  func(*Report)
		refuse  string // of /alive /ready /healthy
		trouble string
	}{
		{"nothing", func(*Report) {}, "", ""},
		{"beat at the limit", func(r *Report) { r.Beat = noon.Add(-2 * time.Minute) }, "", ""},
		{"beat past the limit", func(r *Report) { r.Beat = noon.Add(-2*time.Minute - 1) }, "/alive /healthy", "the loop has given no sign of life for 2m0s, the limit is 2m0s"},
		{"beat far ahead", func(r *Report) { r.Beat = noon.Add(time.Hour) }, "/alive /healthy", "the loop has given no sign of life for 1h0m0s, the limit is 2m0s"},
		{"no beat yet", func(r *Report) { r.Beat = time.Time{} }, "/alive /healthy", "the loop has not begun"},
		{"ledger closed", func(r *Report) { r.Ledger.Open = false }, "/ready /healthy", "the ledger is not open"},
		{"no configuration", func(r *Report) { r.Configuration.Valid = false }, "/ready /healthy", "no valid configuration is in force"},
		{"stopping", func(r *Report) { r.Stopping = true }, "/ready /healthy", "the daemon is stopping"},
		{"reload refused", func(r *Report) { r.Configuration.Error, r.Configuration.ErrorAt = "strayd.yaml:3:1: unknown key", noon }, "", ""},
		{"channel waits", func(r *Report) { r.Channels[0].State, r.Channels[0].Reason = ChannelWaiting, "rate limit" }, "", ""},
		{"channel dead", func(r *Report) { r.Channels[0].State, r.Channels[0].Reason = ChannelDead, "invalid_auth" }, "/healthy", `channel "desk" is dead: invalid_auth`},
		{"dead with a fallback", func(r *Report) {
			r.Channels[0].State, r.Channels[0].Reason, r.Channels[0].Fallback = ChannelDead, "invalid_auth", "ops"
		},
			"/healthy", `channel "desk" is dead: invalid_auth, channel "ops" stands in`},
		{"fallback took over", func(r *Report) { r.Channels[0].State, r.Channels[0].Fallback = ChannelWaiting, "ops" }, "/healthy",
			`channel "desk" delivers nothing, channel "ops" stands in`},
		{"notice at the limit", func(r *Report) { r.Channels[0].Oldest = noon.Add(-15 * time.Minute) }, "", ""},
		{"notice past the limit", func(r *Report) { r.Channels[0].Oldest = noon.Add(-16 * time.Minute) }, "/healthy", `channel "desk" has a notice that has waited for 16m0s, the limit is 15m0s`},
		{"slot at twice its interval", func(r *Report) { r.Jobs[0].NextSlot = noon.Add(-20 * time.Minute) }, "", ""},
		{"slot past twice its interval", func(r *Report) { r.Jobs[0].NextSlot = noon.Add(-21 * time.Minute) }, "/healthy",
			`job "administrator" has been due since 2026-03-13T11:39:00.000Z, more than twice its interval of 10m0s`},
		{"slot without an interval", func(r *Report) { r.Jobs[0].NextSlot, r.Jobs[0].Every = noon.Add(-99*time.Hour), 0 }, "", ""},
		{"no next slot", func(r *Report) { r.Jobs[0].NextSlot = time.Time{} }, "", ""},
	} {
		r := sound()
		c.change(&r)
		for _, path := range []string{"/alive", "/ready", "/healthy"} {
			w, word := get(r, path), strings.TrimPrefix(path, "/")
			want, body := http.StatusOK, word+"\n"
			if slices.Contains(strings.Fields(c.refuse), path) {
				want, body = http.StatusServiceUnavailable, "not "+word+"\n"+c.trouble+"\n"
			}
			if w.Code != want || w.Body.String() != body {
				t.Errorf("%s: %s answers %d %q, want %d %q", c.name, path, w.Code, w.Body, want, body)
			}
		}
		var s stateJSON
		if err := json.Unmarshal(get(r, "/state").Body.Bytes(), &s); err != nil {
			t.Fatal(err)
		}
		if got := strings.Join(s.Troubles, "\n"); got != c.trouble || s.Healthy != (c.trouble == "") {
			t.Errorf("%s: /state healthy %v, troubles %q, want %q", c.name, s.Healthy, got, c.trouble)
		}
	}
}

// A page gives its own reasons and not those of another.
func TestReasonsOfTwoPages(t *testing.T) {
	for path, want := range map[string]string{
		"/alive":   "not alive\nthe loop has not begun\n",
		"/ready":   "not ready\nthe ledger is not open\nno valid configuration is in force\n",
		"/healthy": "not healthy\nthe loop has not begun\nthe ledger is not open\nno valid configuration is in force\n",
	} {
		if got := get(Report{}, path).Body.String(); got != want {
			t.Errorf("%s: %q, want %q", path, got, want)
		}
	}
}

func TestClockThatIsSetMakesNobodyLookDead(t *testing.T) {
	r := sound()
	r.Beat = time.Now()
	r.Now = time.Now()
	// Round strips the monotonic reading and Add keeps it: what a wall clock set by an hour would look like without it.
	if bare := r.Now.Round(0).Add(time.Hour); !lookAt(r, time.Minute).alive || lookAt(Report{Beat: r.Beat, Now: bare}, time.Minute).alive {
		t.Error("alive is not told by the monotonic readings")
	}
}

// The keys are those of the package comment, and those that hold nothing are there all the same.
func TestStateHasItsKeys(t *testing.T) {
	const zeroKinds = `"limit":0,"doubtful":0,"stale":0,"repeat":0,"missing":0,"late":0,"refused":0,"restated":0,"drift":0,"volatility":0,"misfit":0`
	for _, c := range []struct {
		report Report
		want   string
	}{
		{sound(), `{"version":"1.2.3","now":"2026-03-13T12:00:00.000Z","started":"2026-03-12T10:00:00.000Z","beat":"2026-03-13T11:59:40.000Z",
			"alive":true,"ready":true,"healthy":true,"stopping":false,"troubles":[],
			"ledger":{"open":true,"path":"/books/ledger.db","step":41,"bytes":1048576,"series":12},
			"configuration":{"valid":true,"hash":"c0ffee","error":null,"error_at":null},
			"jobs":[{"job":"administrator","last_slot":"2026-03-13T11:50:00.000Z","outcome":"done","error":null,"next_slot":"2026-03-13T12:00:00.000Z",
				"running_since":null,"overdue":false,"runs":7,"failed":2,"panics":1,"missed":3,"coalesced":4}],
			"channels":[{"channel":"desk","state":"ok","reason":null,"waiting":2,"failed":1,"oldest_waiting":"2026-03-13T11:59:00.000Z","error":null,"fallback":null}],
			"feeds":[{"feed":"administrator","file":"2026-03-12.csv","date":"2026-03-12","at":"2026-03-13T11:00:00.000Z"},
				{"feed":"prices","file":null,"date":null,"at":null}],
			"last_pass":{"number":9,"started":"2026-03-13T11:50:00.000Z","ended":"2026-03-13T11:50:00.060Z","error":null,"accepted":1,"refused":2,"waiting":3,
				"verdicts":{"inside":10,"watch":0,"breach":1,"not judged":1},"flags":{"breach":1,"market-day":0,` + zeroKinds + `}},
			"open_flags":{"breach":2,"market-day":1,` + zeroKinds + `},"clock_steps":1}`},
		{Report{}, `{"version":"","now":null,"started":null,"beat":null,"alive":false,"ready":false,"healthy":false,"stopping":false,
			"troubles":["the loop has not begun","the ledger is not open","no valid configuration is in force"],
			"ledger":{"open":false,"path":"","step":0,"bytes":0,"series":0},
			"configuration":{"valid":false,"hash":null,"error":null,"error_at":null},
			"jobs":[],"channels":[],"feeds":[],"last_pass":null,
			"open_flags":{"breach":0,"market-day":0,` + zeroKinds + `},"clock_steps":0}`},
	} {
		w := get(c.report, "/state")
		if got, want := compact(t, w.Body.Bytes()), compact(t, []byte(c.want)); w.Code != 200 || !reflect.DeepEqual(got, want) {
			t.Errorf("/state is\n%s\nwant\n%s", w.Body, c.want)
		}
	}
}

func compact(t *testing.T, text []byte) (v any) {
	t.Helper()
	if err := json.Unmarshal(text, &v); err != nil {
		t.Fatalf("%v in %s", err, text)
	}
	return v
}

func readPage(t *testing.T, r Report) *exposition {
	t.Helper()
	w := get(r, "/metrics")
	e, err := readMetrics(w.Body.String())
	if err != nil || w.Code != 200 {
		t.Fatalf("status %d, %v", w.Code, err)
	}
	return e
}

func TestMetricsSayWhatTheReportSays(t *testing.T) {
	r := sound()
	r.Channels[0].State, r.Jobs[0].Running = ChannelDead, noon
	r.Jobs[0].NextSlot = noon.Add(-21 * time.Minute)
	e := readPage(t, r)
	const second = 1773403200 // noon: date -u -d '2026-03-13 12:00' +%s
	want := map[string]float64{
		`strayd_build_info{version="1.2.3"}`: 1, "strayd_start_timestamp_seconds": second - 26*3600, "strayd_beat_timestamp_seconds": second - 20,
		"strayd_alive": 1, "strayd_ready": 1, "strayd_healthy": 0, "strayd_reload_refused": 0,
		"strayd_ledger_step": 41, "strayd_ledger_size_bytes": 1048576, "strayd_ledger_series": 12, "strayd_clock_steps_total": 1,
		`strayd_job_runs_total{job="administrator"}`: 7, `strayd_job_failed_total{job="administrator"}`: 2, `strayd_job_panics_total{job="administrator"}`: 1,
		`strayd_job_missed_total{job="administrator"}`: 3, `strayd_job_coalesced_total{job="administrator"}`: 4,
		`strayd_job_running{job="administrator"}`: 1, `strayd_job_overdue{job="administrator"}`: 1,
		`strayd_job_last_slot_timestamp_seconds{job="administrator"}`: second - 600, `strayd_job_next_slot_timestamp_seconds{job="administrator"}`: second - 21*60,
		`strayd_channel_dead{channel="desk"}`: 1, `strayd_channel_waiting_notices{channel="desk"}`: 2, `strayd_channel_failed_notices{channel="desk"}`: 1,
		`strayd_channel_oldest_waiting_seconds{channel="desk"}`: 60, `strayd_feed_accepted_timestamp_seconds{feed="administrator"}`: second - 3600,
		"strayd_pass_number": 9, "strayd_pass_started_timestamp_seconds": second - 600, "strayd_pass_ended_timestamp_seconds": second - 600 + 0.06,
		`strayd_pass_files{fate="accepted"}`: 1, `strayd_pass_files{fate="refused"}`: 2, `strayd_pass_files{fate="waiting"}`: 3,
		`strayd_pass_verdicts{finding="inside"}`: 10, `strayd_pass_verdicts{finding="watch"}`: 0, `strayd_pass_verdicts{finding="breach"}`: 1,
		`strayd_pass_verdicts{finding="not judged"}`: 1,
	}
	for _, k := range rules.Kinds {
		want[fmt.Sprintf("strayd_open_flags{kind=%q}", k)] = 0
		want[fmt.Sprintf("strayd_pass_flags{kind=%q}", k)] = 0
	}
	want[`strayd_open_flags{kind="breach"}`], want[`strayd_open_flags{kind="market-day"}`], want[`strayd_pass_flags{kind="breach"}`] = 2, 1, 1
	for id, n := range want {
		if got, ok := e.values[id]; !ok || got != n {
			t.Errorf("%s is %v (there: %v), want %v", id, got, ok, n)
		}
	}
	for id := range e.values {
		if _, ok := want[id]; !ok {
			t.Errorf("%s is not expected", id)
		}
	}
}

func TestMetricsWithoutAnything(t *testing.T) {
	e := readPage(t, Report{})
	if e.values["strayd_alive"] != 0 || e.values["strayd_ready"] != 0 {
		t.Error("an empty report is not dead")
	}
	for name := range e.kinds {
		if e.helps[name] == "" {
			t.Errorf("%s has no help", name)
		}
	}
}

// What files and series are called, what errors say and what hashes are makes no new figure.
func TestMetricsAreBounded(t *testing.T) {
	r := sound()
	r.Ledger.Path, r.Ledger.Series, r.Ledger.Step = "/elsewhere/other.db", 1_000_000, 1<<40
	r.Configuration.Hash, r.Configuration.Error = "beef", "wrong"
	r.Jobs[0].Error, r.Jobs[0].Outcome = "file alder.csv: unreadable", "failed"
	r.Channels[0].Reason, r.Channels[0].Error = "invalid_auth", "invalid_auth"
	r.Feeds[0].File = "alder.csv"
	r.Pass.Error = "feed administrator: alder.csv"
	r.Pass.Flags["an invented kind"], r.Pass.Verdicts["an invented finding"], r.OpenFlags["alder-core"] = 1, 1, 1
	a, b := slices.Sorted(maps.Keys(readPage(t, sound()).values)), slices.Sorted(maps.Keys(readPage(t, r).values))
	if !slices.Equal(a, b) {
		t.Errorf("the figures differ:\n%v\n%v", a, b)
	}
}

// Names that would break a line, a quote or a terminal stay one label, one JSON text, one line.
func TestHostileNames(t *testing.T) {
	for _, name := range []string{"a\nstrayd_alive 1", `a"} 1`, `a\`, "a\xffb", "\u202eevil", "a\r\n# EOF\n", "\x1b[31m", strings.Repeat("long", 10_000), "ünïcode ✓"} {
		r := sound()
		r.Jobs[0].Name, r.Channels[0].Name, r.Feeds[0].Name, r.Version = name, name, name, name
		r.Channels[0].State, r.Channels[0].Reason = ChannelDead, name
		meant := strings.ToValidUTF8(name, "\uFFFD")
		e := readPage(t, r)
		if n := e.values[`strayd_job_runs_total{job=`+fmt.Sprintf("%q", meant)+"}"]; n != 7 {
			t.Errorf("%.40q: its runs are %v", name, n)
		}
		var s stateJSON
		if err := json.Unmarshal(get(r, "/state").Body.Bytes(), &s); err != nil || s.Jobs[0].Job != meant {
			t.Errorf("%.40q: %v in /state, %v", name, s.Jobs, err)
		}
		if body := get(r, "/healthy").Body.String(); strings.Count(body, "\n") != 2 || strings.ContainsAny(body, "\r\x1b\u202e") {
			t.Errorf("%.40q: /healthy says %.80q", name, body)
		}
	}
}

func TestHeadersAndContentTypes(t *testing.T) {
	for path, kind := range map[string]string{"/alive": plainText, "/ready": plainText, "/healthy": plainText, "/state": "application/json",
		"/metrics": "application/openmetrics-text; version=1.0.0; charset=utf-8", "/other": plainText} {
		h := get(sound(), path).Result().Header
		if h.Get("Content-Type") != kind {
			t.Errorf("%s is %q, want %q", path, h.Get("Content-Type"), kind)
		}
		for k, v := range map[string]string{"X-Content-Type-Options": "nosniff", "Cache-Control": "no-store", "X-Frame-Options": "DENY",
			"Content-Security-Policy": "default-src 'none'; frame-ancestors 'none'", "Cross-Origin-Resource-Policy": "same-origin", "Referrer-Policy": "no-referrer"} {
			if h.Get(k) != v {
				t.Errorf("%s: %s is %q, want %q", path, k, h.Get(k), v)
			}
		}
		if h.Get("Access-Control-Allow-Origin") != "" {
			t.Errorf("%s lets other origins read it", path)
		}
	}
}
