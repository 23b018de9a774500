package page

import (
	"crypto/rand"
	"crypto/sha256"
	"crypto/subtle"
	"encoding/base64"
	"sync"
	"time"

	"strayd/rules"
)

const (
	// linkTime is how long a link waits to be taken up.
	linkTime = 2 * time.Minute
	// deskTime is how long a desk is open: a working day.
	deskTime = 10 * time.Hour
	// mostLinks and mostDesks bound what is kept; the oldest goes first.
	mostLinks = 100
	mostDesks = 1000
)

// digest is what is kept of a secret, so that a look into memory that went to a file gives nothing away.
type digest [sha256.Size]byte

func digestOf(secret string) digest { return sha256.Sum256([]byte(secret)) }

// secret is a new random text for a URL, of 24 characters.
func secret() string {
	b := make([]byte, 18)
	rand.Read(b) //nolint:errcheck // never fails
	return base64.RawURLEncoding.EncodeToString(b)
}

// desk is one person's place at the page.
type desk struct {
	who   rules.Person
	path  string // "" behind a proxy, which says of each request who makes it
	form  string // token that every form carries
	until time.Time

	mu   sync.Mutex
	said *Outcome // of the last deed, to be shown once
}

// say keeps what the page shows next.
func (d *desk) say(o *Outcome) {
	d.mu.Lock()
	defer d.mu.Unlock()
	d.said = o
}

// hear is what is to be shown, once.
func (d *desk) hear() *Outcome {
	d.mu.Lock()
	defer d.mu.Unlock()
	o := d.said
	d.said = nil
	return o
}

// owns says whether a form was made for this desk.
func (d *desk) owns(form string) bool {
	return subtle.ConstantTimeCompare([]byte(form), []byte(d.form)) == 1
}

// link is an invitation that nobody has taken up yet.
type link struct {
	who   rules.Person
	until time.Time
}

// door keeps links and desks. Its zero value is closed to nobody and knows nobody.
type door struct {
	now   func() time.Time
	mu    sync.Mutex
	links map[digest]link
	desks map[digest]*desk
	known map[rules.Person]*desk // behind a proxy
}

func newDoor(now func() time.Time) *door {
	return &door{now: now, links: map[digest]link{}, desks: map[digest]*desk{}, known: map[rules.Person]*desk{}}
}

// invite makes a link's token for a person.
func (d *door) invite(who rules.Person) (token string) {
	d.mu.Lock()
	defer d.mu.Unlock()
	trim(d.links, mostLinks, d.now(), func(l link) time.Time { return l.until })
	token = secret()
	d.links[digestOf(token)] = link{who, d.now().Add(linkTime)}
	return token
}

// whose says for whom a link is, without taking it up.
func (d *door) whose(token string) (who rules.Person, ok bool) {
	d.mu.Lock()
	defer d.mu.Unlock()
	l, ok := d.links[digestOf(token)]
	return l.who, ok && d.now().Before(l.until)
}

// enter takes a link up, once, and gives the desk and its cookie.
func (d *door) enter(token string) (place *desk, cookie string, ok bool) {
	d.mu.Lock()
	defer d.mu.Unlock()
	key := digestOf(token)
	l, ok := d.links[key]
	delete(d.links, key)
	if !ok || !d.now().Before(l.until) {
		return nil, "", false
	}
	trim(d.desks, mostDesks, d.now(), func(p *desk) time.Time { return p.until })
	cookie = secret()
	place = &desk{who: l.who, path: "/desk/" + secret(), form: secret(), until: d.now().Add(deskTime)}
	d.desks[digestOf(cookie)] = place
	return place, cookie, true
}

// find is the open desk of a cookie.
func (d *door) find(cookie string) *desk {
	d.mu.Lock()
	defer d.mu.Unlock()
	if p := d.desks[digestOf(cookie)]; p != nil && d.now().Before(p.until) {
		return p
	}
	return nil
}

// leave closes a desk.
func (d *door) leave(cookie string) {
	d.mu.Lock()
	defer d.mu.Unlock()
	delete(d.desks, digestOf(cookie))
}

// vouched is the desk of somebody whom the proxy names.
func (d *door) vouched(who rules.Person) *desk {
	d.mu.Lock()
	defer d.mu.Unlock()
	p := d.known[who]
	if p == nil {
		trim(d.known, mostDesks, d.now(), func(p *desk) time.Time { return p.until })
		p = &desk{who: who, form: secret(), until: d.now().Add(deskTime)}
		d.known[who] = p
	}
	return p
}

// trim drops what is over, and the oldest ones beyond the most.
func trim[K comparable, V any](all map[K]V, most int, now time.Time, until func(V) time.Time) {
	for k, v := range all {
		if !now.Before(until(v)) {
			delete(all, k)
		}
	}
	for len(all) >= most {
		var oldest K
		first := true
		for k, v := range all {
			if first || until(v).Before(until(all[oldest])) {
				oldest, first = k, false
			}
		}
		delete(all, oldest)
	}
}
