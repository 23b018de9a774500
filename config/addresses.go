package config

import (
	"errors"
	"net"
	"net/mail"
	"net/url"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"strayd/rules"
)

// thisMachine says whether a host is the machine itself.
func thisMachine(host string) bool {
	ip := net.ParseIP(host)
	return host == "localhost" || ip != nil && ip.IsLoopback()
}

// webAddress is where a webhook posts to. It may be a secret of its own, so no error repeats it.
func webAddress() shape {
	what := "an address such as https://host/path; http on this machine alone"
	return text(what, `^https?://[^\s@#]+$`, func(_ *decoder, s string) error {
		u, err := url.Parse(s)
		hide := func(message string) error { return trouble{message: message, got: "an address"} }
		switch {
		case err != nil || u.Hostname() == "" || u.Scheme != "https" && u.Scheme != "http" || strings.ContainsAny(s, " "):
			return hide("not an address")
		case u.User != nil || u.Fragment != "" || strings.ContainsAny(s, "@#"):
			return hide("an address with a user or a fragment")
		case u.Scheme == "http" && !thisMachine(u.Hostname()):
			return hide("an address without encryption")
		}
		return nil
	})
}

// mailAddress is one address of ASCII, with or without a name before it.
func mailAddress() shape {
	return text("a mail address such as desk@example.org", `^\S(.*\S)?@\S+$`, func(d *decoder, s string) error {
		a, err := mail.ParseAddress(s)
		if err != nil || strings.ContainsFunc(a.Address, func(r rune) bool { return r <= ' ' || r > '~' }) {
			return errors.New("not a mail address")
		}
		return filled(d, s)
	})
}

func hostPort() shape {
	return text("a server and its port such as mail.example.org:587", `^\S+:[0-9]{1,5}$`, func(d *decoder, s string) error {
		host, port, err := net.SplitHostPort(s)
		if n, bad := strconv.Atoi(port); err != nil || bad != nil || host == "" || n < 1 || n > 65535 || strings.ContainsAny(host, " @/") {
			return errors.New("not a server and a port")
		}
		return filled(d, s)
	})
}

// The names of hosts and of headers. The JSON Schema holds them too.
const (
	hostPattern   = `^[A-Za-z0-9]([A-Za-z0-9.-]*[A-Za-z0-9])?$`
	headerPattern = `^[A-Za-z][A-Za-z0-9-]*$`
)

// fitting is text that fits a pattern.
func fitting(what, example, pattern string) shape {
	fits := regexp.MustCompile(pattern)
	return text(what+" such as "+example, pattern, func(_ *decoder, s string) error {
		if !fits.MatchString(s) {
			return errors.New("not " + what)
		}
		return nil
	})
}

// loopback is an address that this machine alone reaches, and its port.
func loopback() shape {
	return text("a loopback address and its port such as 127.0.0.1:9302", `^\S+:[0-9]{1,5}$`, func(d *decoder, s string) error {
		host, port, err := net.SplitHostPort(s)
		n, bad := strconv.Atoi(port)
		if err != nil || bad != nil || n < 1 || n > 65535 || !thisMachine(host) {
			return errors.New("not a loopback address and a port")
		}
		return nil
	})
}

// page checks what ties the keys of the page together.
func (d *decoder) page(p *Page) {
	if p.Identity != "" && (p.Host == "" || p.Listen == "") && d.sound("page") {
		d.failAt("page.identity", trouble{message: "a header is believed of a proxy alone", got: p.Identity, want: "listen and host beside it"})
	}
}

// channel checks what ties the keys of a channel together and to other channels.
func (d *decoder) channel(p string, ch *rules.Channel, all []rules.Channel) {
	if ch.Mail != nil && ch.Mail.Security == "none" && d.sound(p+".mail") {
		if host, _, _ := net.SplitHostPort(ch.Mail.Server); !thisMachine(host) {
			d.failAt(p+".mail.tls", trouble{message: "mail without encryption", got: "none", want: "starttls or implicit; none on this machine alone"})
		}
	}
	if ch.Fallback == "" {
		if d.has(p + ".fallback_after") {
			d.failAt(p+".fallback_after", trouble{message: "a time without a fallback", want: "fallback beside it"})
		}
		return
	}
	if d.sound("channels") {
		d.fallback(p+".fallback", ch, all)
	}
}

// fallback holds that a chain of fallbacks ends, and that none tells more than the channel that it stands in for.
func (d *decoder) fallback(p string, ch *rules.Channel, all []rules.Channel) {
	var names []string
	for _, c := range all {
		names = append(names, c.Name)
	}
	at := slices.Index(names, ch.Fallback)
	switch {
	case at < 0:
		d.failAt(p, trouble{message: "no such channel", got: shown(ch.Fallback), want: either(nearest(ch.Fallback, names), spelled(names))})
	case all[at].Short && !ch.Short:
		d.failAt(p, trouble{message: "a fallback of short form", got: shown(ch.Fallback), want: "one of full form, or form: short here too",
			hint: "what this channel is told would be too much for the other"})
	case circles(ch, all):
		d.failAt(p, trouble{message: "fallbacks in a circle", got: shown(ch.Fallback), want: "a chain that ends"})
	}
}

// circles says whether the fallbacks of a channel lead back to it.
func circles(ch *rules.Channel, all []rules.Channel) bool {
	next := map[string]string{}
	for _, c := range all {
		next[c.Name] = c.Fallback
	}
	at := ch.Fallback
	for range all {
		if at == ch.Name {
			return true
		}
		at = next[at]
	}
	return false
}
