package health

import (
	"net"
	"net/http"
	"net/netip"
	"strings"
)

// guard lets through only what a program on this machine asks for. A page of another site that a browser shows could reach the
// listener too, by its address or by a name that it points here: the first is told by its origin, the second by the Host.
func guard(h http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		harden(w.Header())
		switch {
		case r.Method != http.MethodGet && r.Method != http.MethodHead:
			w.Header().Set("Allow", "GET, HEAD")
			refuse(w, http.StatusMethodNotAllowed, "only GET and HEAD are answered")
		case !LoopbackHost(r.Host):
			refuse(w, http.StatusMisdirectedRequest, "the Host of a request must be localhost or a loopback address")
		case !ownOrigin(r):
			refuse(w, http.StatusForbidden, "requests from other origins are not answered")
		default:
			h.ServeHTTP(w, r)
		}
	})
}

// harden sets what tells a browser to do nothing with an answer but show it. The content type is the one of answers that set none.
func harden(h http.Header) {
	h.Set("Content-Type", plainText)
	h.Set("X-Content-Type-Options", "nosniff")
	h.Set("Cache-Control", "no-store")
	h.Set("Content-Security-Policy", "default-src 'none'; frame-ancestors 'none'")
	h.Set("Cross-Origin-Resource-Policy", "same-origin")
	h.Set("Referrer-Policy", "no-referrer")
	h.Set("X-Frame-Options", "DENY")
}

// LoopbackHost says whether a Host, with or without port, is localhost or a loopback address. What a name resolves to is not
// asked: that is what a rebound name lies about.
func LoopbackHost(hostport string) bool {
	host, _, err := net.SplitHostPort(hostport)
	if err != nil { // without a port
		host = strings.TrimSuffix(strings.TrimPrefix(hostport, "["), "]")
	}
	if strings.EqualFold(strings.TrimSuffix(host, "."), "localhost") {
		return true
	}
	ip, err := netip.ParseAddr(host)
	return err == nil && ip.Unmap().IsLoopback()
}

// ownOrigin says whether a request comes from no page at all, or from one of this listener's own.
func ownOrigin(r *http.Request) bool {
	switch r.Header.Get("Sec-Fetch-Site") {
	case "", "none", "same-origin":
	default:
		return false
	}
	origin := r.Header.Get("Origin")
	return origin == "" || strings.EqualFold(origin, "http://"+r.Host)
}
