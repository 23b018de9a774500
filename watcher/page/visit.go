package page

import (
	"bytes"
	"context"
	"embed"
	"errors"
	"fmt"
	"html/template"
	"io/fs"
	"net/http"
	"strings"
	"time"

	"strayd/watcher"
)

//go:embed *.html desk.css
var files embed.FS

// parsePages reads the templates, each with the frame around it.
func parsePages() (map[string]*template.Template, error) {
	frame, err := template.New("frame.html").Funcs(words()).ParseFS(files, "frame.html", "parts.html")
	if err != nil {
		return nil, err
	}
	names, err := fs.Glob(files, "*.html")
	if err != nil {
		return nil, err
	}
	pages := map[string]*template.Template{}
	for _, name := range names {
		base := strings.TrimSuffix(name, ".html")
		if base == "frame" || base == "parts" {
			continue
		}
		t, err := frame.Clone()
		if err == nil {
			t, err = t.ParseFS(files, name)
		}
		if err != nil {
			return nil, err
		}
		pages[base] = t
	}
	return pages, nil
}

func style(w http.ResponseWriter, r *http.Request) {
	http.ServeFileFS(w, r, files, "desk.css")
}

// write sends a page whole or not at all.
func (p *Page) write(w http.ResponseWriter, status int, name string, s *sheet) {
	var b bytes.Buffer
	if err := p.pages[name].Execute(&b, s); err != nil {
		p.src.Log.Error("the desk page cannot be written", "page", name, "error", err)
		http.Error(w, "the page could not be written; the daemon's log says why", http.StatusInternalServerError)
		return
	}
	w.Header().Set("Content-Type", "text/html; charset=utf-8")
	w.WriteHeader(status)
	w.Write(b.Bytes()) //nolint:errcheck // whoever asked has gone
}

// visit is one request of somebody at a desk.
type visit struct {
	page *Page
	desk *desk
	w    http.ResponseWriter
	r    *http.Request
}

// mayTake gives an answer more time than the server does. Where that cannot be set, the server's own holds.
func (v *visit) mayTake(long time.Duration) {
	c := http.NewResponseController(v.w)
	_ = c.SetWriteDeadline(time.Now().Add(long))
	_ = c.SetReadDeadline(time.Now().Add(long))
}

// refusal is an error that is the visitor's to put right.
type refusal struct {
	status int
	text   string
}

func (r refusal) Error() string { return r.text }

func notThere(format string, args ...any) error {
	return refusal{http.StatusNotFound, fmt.Sprintf(format, args...)}
}

// show writes a page of the desk.
func (v *visit) show(status int, name, title, here string, body any, said *Outcome) error {
	v.page.write(v.w, status, name, &sheet{Title: title, Who: v.desk.who, Form: v.desk.form, Here: here, Said: said, Body: body})
	return nil
}

// failed says why a page cannot be shown.
func (v *visit) failed(err error) {
	var r refusal
	var unknown *watcher.UnknownSeries
	var ref *watcher.UnknownRef
	switch {
	case errors.As(err, &r):
	case errors.As(err, &unknown), errors.As(err, &ref):
		r = refusal{http.StatusNotFound, err.Error()}
	case errors.Is(err, context.Canceled):
		return
	default:
		v.page.src.Log.Error("a page of the desk cannot be made", "error", err)
		r = refusal{http.StatusInternalServerError, err.Error()}
	}
	_ = v.show(r.status, "trouble", "Not to be had", "", r.text, nil)
}

// ownForm is the error of a form that this desk did not make.
func (v *visit) ownForm() error {
	switch {
	case !isForm(v.r):
		return refusal{http.StatusUnsupportedMediaType, "that was no form of this page"}
	case v.r.ParseForm() != nil:
		return refusal{http.StatusBadRequest, "the form cannot be read"}
	case !v.desk.owns(v.r.PostForm.Get("form")):
		return refusal{http.StatusForbidden, "the form was made for another desk: open the page again"}
	}
	return nil
}

// reading opens a view for one request.
func (p *Page) reading(do func(v watcher.View) error) error {
	v, err := p.src.View()
	if err != nil {
		return err
	}
	defer v.Close() //nolint:errcheck // only read
	return do(v)
}
