package page

import (
	"net/http"
	"net/url"
	"strings"
)

const (
	enterPath  = "/enter"
	stylePath  = "/desk.css"
	cookieName = "strayd_desk"
	// largestForm bounds what a form sends, in bytes.
	largestForm = 1 << 20
	// atOnce bounds how many pages are made at the same time; further ones wait their turn.
	atOnce = 8
)

// policy lets a page load its style and send its forms here, and nothing else: no script of any kind.
const policy = "default-src 'none'; style-src 'self'; img-src 'self'; form-action 'self'; base-uri 'none'; frame-ancestors 'none'"

// Handler answers all requests.
func (p *Page) Handler() http.Handler {
	mux := http.NewServeMux()
	mux.HandleFunc("GET "+stylePath, style)
	mux.HandleFunc("GET "+enterPath, p.enterPage)
	mux.HandleFunc("POST "+enterPath, p.enter)
	mux.HandleFunc("/", p.atDesk)
	cross := http.NewCrossOriginProtection()
	cross.SetDenyHandler(http.HandlerFunc(func(w http.ResponseWriter, _ *http.Request) {
		p.refuse(w, http.StatusForbidden, "That came from a page of another site.", "")
	}))
	return p.calm(p.guard(cross.Handler(few(mux))))
}

// guard sets what tells a browser to do nothing with an answer but show it, and lets only requests in that name this listener and come
// from none but its own pages.
func (p *Page) guard(next http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		h := w.Header()
		h.Set("X-Content-Type-Options", "nosniff")
		h.Set("Cache-Control", "no-store")
		h.Set("Content-Security-Policy", policy)
		h.Set("Cross-Origin-Resource-Policy", "same-origin")
		h.Set("Cross-Origin-Opener-Policy", "same-origin")
		h.Set("Referrer-Policy", "no-referrer")
		h.Set("X-Frame-Options", "DENY")
		switch {
		case !p.src.Host(r.Host):
			p.refuse(w, http.StatusMisdirectedRequest, "This page is not served under that name.", "")
		case !ownOrigin(r):
			p.refuse(w, http.StatusForbidden, "That came from a page of another site.", "")
		default:
			r.Body = http.MaxBytesReader(w, r.Body, largestForm)
			next.ServeHTTP(w, r)
		}
	})
}

// ownOrigin says that a request names no origin, or the host that it goes to. With no-referrer, a browser says null of a form on our own
// page; that one is told by Sec-Fetch-Site.
func ownOrigin(r *http.Request) bool {
	origin := r.Header.Get("Origin")
	switch {
	case origin == "":
		return true
	case origin == "null":
		return r.Header.Get("Sec-Fetch-Site") == "same-origin"
	}
	u, err := url.Parse(origin)
	return err == nil && strings.EqualFold(u.Host, r.Host)
}

// few lets only so many requests in at once, so that many readers do not take the time of a pass.
func few(next http.Handler) http.Handler {
	room := make(chan struct{}, atOnce)
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if r.Method == http.MethodPost { // a deed waits for the pass under way, and must not keep readers out meanwhile
			next.ServeHTTP(w, r)
			return
		}
		select {
		case room <- struct{}{}:
			defer func() { <-room }()
			next.ServeHTTP(w, r)
		case <-r.Context().Done():
		}
	})
}

// calm turns a panic into a bare answer. The path may hold a desk's secret, so that the log gets none of it.
func (p *Page) calm(next http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		defer func() {
			if v := recover(); v != nil {
				p.src.Log.Error("the desk page failed", "panic", v)
				p.refuse(w, http.StatusInternalServerError, "The page could not be made; the daemon's log says why.", "")
			}
		}()
		next.ServeHTTP(w, r)
	})
}

// atDesk finds out who asks and shows their desk.
func (p *Page) atDesk(w http.ResponseWriter, r *http.Request) {
	d := p.deskOf(r)
	if d == nil {
		p.refuse(w, http.StatusUnauthorized, "Nobody is known at this desk.",
			"Run `strayd desk` on the machine of the daemon: it makes a link for you, which is good for two minutes and for one use.")
		return
	}
	path, ok := strings.CutPrefix(r.URL.Path, d.path+"/")
	if !ok {
		p.refuse(w, http.StatusUnauthorized, "Nobody is known at this desk.", "Run `strayd desk` for a link.")
		return
	}
	inner := r.Clone(r.Context())
	inner.URL.Path, inner.URL.RawPath = "/"+path, ""
	p.rooms(d).ServeHTTP(w, inner)
}

// deskOf is the desk of whoever asks: of the one whom a proxy names, or of the cookie's.
func (p *Page) deskOf(r *http.Request) *desk {
	if who, ok := p.src.Proxied(Asked{r.Host, r.Header.Get}); ok {
		return p.door.vouched(who)
	}
	if c, err := r.Cookie(cookieName); err == nil {
		return p.door.find(c.Value)
	}
	return nil
}

// rooms are the pages of a desk. All lie side by side, so that their links are plain names wherever the desk is.
func (p *Page) rooms(d *desk) http.Handler {
	mux := http.NewServeMux()
	for pattern, show := range map[string]func(*visit) error{
		"GET /{$}":    p.showToday,
		"GET /flag":   p.showFlag,
		"GET /flags":  p.showFlags,
		"GET /series": p.showSeries,
		"GET /feeds":  p.showFeeds,
		"GET /weeks":  p.showWeeks,
		"GET /week":   p.showWeek,
		"POST /act":   p.act,
		"POST /leave": p.leave,
	} {
		mux.HandleFunc(pattern, func(w http.ResponseWriter, r *http.Request) {
			v := &visit{page: p, desk: d, w: w, r: r}
			if err := show(v); err != nil {
				v.failed(err)
			}
		})
	}
	mux.HandleFunc("/", func(w http.ResponseWriter, r *http.Request) {
		(&visit{page: p, desk: d, w: w, r: r}).failed(notThere("no such page"))
	})
	return mux
}
