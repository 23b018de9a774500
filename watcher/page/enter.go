package page

import (
	"net/http"
	"strings"

	"strayd/rules"
)

// sheet is what every page is made of.
type sheet struct {
	Title string
	Who   rules.Person
	Form  string
	Here  string // the page's place in the menu
	Said  *Outcome
	Body  any
}

const overLink = "A link is good for two minutes and for one use. Run `strayd desk` for a new one."

// enterPage shows for whom a link is. It takes nothing up, so that whatever looks at links ahead of a person does no harm, and so that
// nobody is led to another's desk unawares.
func (p *Page) enterPage(w http.ResponseWriter, r *http.Request) {
	token := r.URL.Query().Get("link")
	who, ok := p.door.whose(token)
	if !ok {
		p.refuse(w, http.StatusForbidden, "This link is not good, or not any more.", overLink)
		return
	}
	p.write(w, http.StatusOK, "enter", &sheet{Title: "Enter", Body: map[string]any{"Who": who, "Token": token}})
}

// enter takes a link up.
func (p *Page) enter(w http.ResponseWriter, r *http.Request) {
	if !isForm(r) {
		p.refuse(w, http.StatusUnsupportedMediaType, "That was no form of this page.", "")
		return
	}
	place, cookie, ok := p.door.enter(r.PostFormValue("link"))
	if !ok {
		p.refuse(w, http.StatusForbidden, "This link is not good, or not any more.", overLink)
		return
	}
	http.SetCookie(w, &http.Cookie{Name: cookieName, Value: cookie, Path: place.path + "/", MaxAge: int(deskTime.Seconds()), HttpOnly: true,
		SameSite: http.SameSiteStrictMode, Secure: r.TLS != nil})
	p.src.Log.Info("somebody is at the desk page", "who", place.who.String())
	http.Redirect(w, r, place.path+"/", http.StatusSeeOther)
}

func (p *Page) leave(v *visit) error {
	if err := v.ownForm(); err != nil {
		return err
	}
	if c, err := v.r.Cookie(cookieName); err == nil {
		p.door.leave(c.Value)
	}
	http.SetCookie(v.w, &http.Cookie{Name: cookieName, Path: v.desk.path + "/", MaxAge: -1, HttpOnly: true, SameSite: http.SameSiteStrictMode})
	p.refuse(v.w, http.StatusOK, "You have left the desk.", "Run `strayd desk` for a new link.")
	return nil
}

func isForm(r *http.Request) bool {
	kind, _, _ := strings.Cut(r.Header.Get("Content-Type"), ";")
	return strings.EqualFold(strings.TrimSpace(kind), "application/x-www-form-urlencoded")
}

// refuse answers somebody who has no desk.
func (p *Page) refuse(w http.ResponseWriter, status int, text, cure string) {
	p.write(w, status, "refused", &sheet{Title: text, Body: map[string]string{"Text": text, "Cure": cure}})
}
