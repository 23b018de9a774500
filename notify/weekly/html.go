package weekly

import (
	_ "embed"
	"html/template"
	"io"

	"strayd/rules"
)

//go:embed page.html
var pageText string

// HTML writes the log as one page to print: the first sheet is complete alone. It loads nothing and runs no script.
func HTML(w io.Writer, l *rules.WeekLog) error {
	t, err := template.New("page").Parse(pageText)
	if err != nil {
		return err
	}
	return t.Execute(w, newPage(l))
}

// SignOff is the section with the blanks to fill in.
func (p *page) SignOff() *section { return p.Sections[len(p.Sections)-1] }

// Details are all sections but the sign-off, which stands on the first sheet.
func (p *page) Details() []*section { return p.Sections[:len(p.Sections)-1] }
