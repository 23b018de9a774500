package health

import (
	"bufio"
	"context"
	"errors"
	"io"
	"net"
	"net/http"
	"strings"
	"testing"
	"testing/synctest"
	"time"
)

func TestAddresses(t *testing.T) {
	for _, good := range []string{"127.0.0.1:9190", "127.0.0.1:0", "127.1.2.3:9190", "localhost:9190", "LOCALHOST:0", "[::1]:9190", "[::ffff:127.0.0.1]:9190"} {
		if err := CheckAddress(good); err != nil {
			t.Errorf("%s: %v", good, err)
		}
	}
	for bad, why := range map[string]string{
		":9190": "loopback", "0.0.0.0:9190": "loopback", "[::]:9190": "loopback", "10.0.0.1:9190": "loopback", "192.168.1.1:1": "loopback",
		"example.org:9190": "loopback", "localhost.example.org:1": "loopback", "128.0.0.1:9190": "loopback", "[fe80::1]:9190": "loopback",
		"[::ffff:10.0.0.1]:9190": "loopback", "127.1:9190": "loopback",
		"": "host:port", "127.0.0.1": "host:port", "::1": "host:port", "::1:9190": "host:port", "9190": "host:port", "http://127.0.0.1:9190": "host:port",
		"127.0.0.1:http": "port must be", "127.0.0.1:65536": "port must be", "127.0.0.1:-1": "port must be", "127.0.0.1:": "port must be",
	} {
		if err := CheckAddress(bad); err == nil || !strings.Contains(err.Error(), why) {
			t.Errorf("%q: %v, want word of %q", bad, err, why)
		}
		if l, err := Listen(bad); err == nil {
			l.Close()
			t.Errorf("%q is listened on", bad)
		}
	}
}

// serving serves a handler until stop is called, which waits for the end and gives its error.
func serving(t *testing.T, h http.Handler) (addr string, stop func() error) {
	t.Helper()
	l, err := Listen("127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	ended := make(chan error, 1)
	go func() { ended <- Serve(ctx, l, h, nil) }()
	return l.Addr().String(), func() error { cancel(); return <-ended }
}

func TestServeAnswersAndStops(t *testing.T) {
	addr, stop := serving(t, pagesOf(sound()))
	if _, err := Listen(addr); err == nil || !strings.Contains(err.Error(), addr) {
		t.Errorf("a taken address: %v", err)
	}
	resp, err := http.Get("http://" + addr + "/alive")
	if err != nil {
		t.Fatal(err)
	}
	body, _ := io.ReadAll(resp.Body)
	resp.Body.Close()
	if resp.StatusCode != 200 || string(body) != "alive\n" {
		t.Errorf("%d %q", resp.StatusCode, body)
	}
	if err := stop(); err != nil {
		t.Errorf("stopped with %v", err)
	}
	if conn, err := net.Dial("tcp", addr); err == nil {
		conn.Close()
		t.Error("it still listens")
	}
}

// What no client library would send.
func TestBareRequests(t *testing.T) {
	addr, stop := serving(t, pagesOf(sound()))
	for request, want := range map[string]string{
		"GET /state HTTP/1.0\r\n\r\n":                                                                  "421",
		"GET /state HTTP/1.0\r\nHost: localhost\r\n\r\n":                                               "200",
		"GET /state HTTP/1.1\r\n\r\n":                                                                  "400",
		"GET /state HTTP/1.1\r\nHost: localhost\r\nHost: example.org\r\n\r\n":                          "400",
		"GET http://example.org/state HTTP/1.1\r\nHost: localhost\r\n\r\n":                             "421", // the request line counts: RFC 9112, 3.2.2
		"OPTIONS * HTTP/1.1\r\nHost: localhost\r\n\r\n":                                                "405",
		"GET /state HTTP/1.1\r\nHost: localhost\r\nX: " + strings.Repeat("x", 64<<10) + "\r\n\r\n":     "431",
		"POST /state HTTP/1.1\r\nHost: localhost\r\nContent-Length: 4\r\n\r\nbody":                     "405",
		"GET /state HTTP/1.1\r\nHost: localhost\r\nOrigin: http://example.org\r\n\r\n":                 "403",
		"HEAD /state HTTP/1.1\r\nHost: localhost\r\nConnection: close\r\n\r\n":                         "200",
		"GET /alive?x=%ff;y HTTP/1.1\r\nHost: [::1]:9190\r\nConnection: close\r\n\r\n":                 "200",
		"GET /alive HTTP/1.1\r\nHost: localhost\r\nUpgrade: h2c\r\nConnection: Upgrade, close\r\n\r\n": "200",
	} {
		conn, err := net.Dial("tcp", addr)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := io.WriteString(conn, request); err != nil {
			t.Errorf("%.60q: %v", request, err)
		}
		line, err := bufio.NewReader(conn).ReadString('\n')
		conn.Close()
		if fields := strings.Fields(line); err != nil || len(fields) < 2 || fields[1] != want {
			t.Errorf("%.60q: %q, %v, want %s", request, line, err, want)
		}
	}
	if err := stop(); err != nil {
		t.Error(err)
	}
}

// pipes is a listener inside the process, so that a bubble's time rules over its connections.
type pipes struct {
	conns  chan net.Conn
	closed chan struct{}
}

func (p *pipes) Accept() (net.Conn, error) {
	select {
	case c := <-p.conns:
		return c, nil
	case <-p.closed:
		return nil, net.ErrClosed
	}
}
func (p *pipes) Close() error   { close(p.closed); return nil }
func (p *pipes) Addr() net.Addr { return &net.TCPAddr{IP: net.IPv4(127, 0, 0, 1)} }

// request sends a request over a connection of its own and gives its answer, or the error, when it comes.
func (p *pipes) request() <-chan string {
	mine, theirs := net.Pipe()
	p.conns <- theirs
	got := make(chan string, 1)
	go func() {
		defer mine.Close()
		io.WriteString(mine, "GET / HTTP/1.1\r\nHost: localhost\r\nConnection: close\r\n\r\n") //nolint:errcheck // seen by the answer
		text, err := io.ReadAll(mine)
		if len(text) == 0 {
			got <- "cut off"
		} else if err == nil {
			got <- string(text[len(text)-4:])
		}
	}()
	return got
}

// From the signal on, a request in progress has 3 seconds: one that ends within them is answered, the other is cut off.
func TestStopLetsRequestsEndButNotForLong(t *testing.T) {
	for _, c := range []struct {
		needs time.Duration // after the signal
		want  string
		ends  time.Duration
	}{
		{2 * time.Second, "done", 2 * time.Second},
		{time.Hour, "cut off", stopTime},
	} {
		synctest.Test(t, func(t *testing.T) {
			ctx, cancel := context.WithCancel(t.Context())
			h := http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
				select {
				case <-time.After(time.Second + c.needs):
					io.WriteString(w, "done") //nolint:errcheck // seen by the answer
				case <-r.Context().Done():
				}
			})
			l := &pipes{make(chan net.Conn), make(chan struct{})}
			ended := make(chan error, 1)
			go func() { ended <- Serve(ctx, l, h, nil) }()
			got := l.request()
			time.Sleep(time.Second)
			signal := time.Now()
			cancel()
			if err := <-ended; err != nil {
				t.Error(err)
			}
			took := time.Since(signal)
			// The server looks every half second at most whether its requests have ended.
			if answer := <-got; answer != c.want || took < c.ends || time.Since(signal) > c.ends+time.Second {
				t.Errorf("a request of %v: %q after %v, stopped after %v, want %q after %v", c.needs, answer, time.Since(signal), took, c.want, c.ends)
			}
		})
	}
}

func TestServeTellsWhyItCannot(t *testing.T) {
	l, err := Listen("127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	l.Close()
	if err := Serve(t.Context(), l, pagesOf(sound()), nil); !errors.Is(err, net.ErrClosed) {
		t.Errorf("a closed listener: %v", err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if l, err = Listen("127.0.0.1:0"); err != nil {
		t.Fatal(err)
	}
	if err := Serve(ctx, l, pagesOf(sound()), nil); err != nil {
		t.Errorf("stopped before it began: %v", err)
	}
	if l.Close() == nil {
		t.Error("the listener was left open")
	}
}
