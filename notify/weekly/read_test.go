package weekly

import (
	"encoding/csv"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"
	"testing"
)

// shown is one figure as a form shows it.
type shown struct{ section, label, text string }

// ofCSV reads the figures of the CSV form.
func ofCSV(t *testing.T, text string, titles map[string]string) (out []shown) {
	t.Helper()
	lines, err := csv.NewReader(strings.NewReader(text)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if !slices.Equal(lines[0], columns) {
		t.Fatalf("columns %q", lines[0])
	}
	for _, l := range lines[1:] {
		for i, c := range l {
			if c != "" && strings.ContainsRune("=+@\t\r", rune(c[0])) && !isNumber(c) {
				t.Errorf("column %s begins like a formula: %q", columns[i], c)
			}
		}
		if l[1] != "verdict" {
			out = append(out, shown{titles[l[1]], l[4], strings.TrimPrefix(l[9], "'")})
		}
	}
	return out
}

func isNumber(s string) bool {
	var v float64
	_, err := fmt.Sscan(s, &v)
	return err == nil
}

// ofText reads the figures of the text form: a label and a value two blanks apart, and tables whose columns begin where those of
// their head do.
func ofText(t *testing.T, text string, sections []*section) (out []shown) {
	t.Helper()
	lines := strings.Split(text, "\n")
	next := slices.Index(lines, "")
	find := func(line string) string {
		t.Helper()
		for ; next < len(lines); next++ {
			if rest, ok := strings.CutPrefix(lines[next], line); ok {
				next++
				return rest
			}
		}
		t.Fatalf("the text has no line %q from there on", line)
		return ""
	}
	for _, s := range sections {
		find(strings.ToUpper(s.Title))
		for range s.Figures {
			label, value, _ := strings.Cut(strings.TrimSpace(lines[next]), "  ")
			out = append(out, shown{s.Title, label, strings.TrimSpace(value)})
			next++
		}
		for _, tab := range s.Tables {
			if find("  "+tab.Title+":") != "" {
				continue // it has no rows
			}
			starts := startsOf(lines[next])
			head := cutAt(lines[next], starts)
			for next++; strings.HasPrefix(lines[next], "    ") && cutAt(lines[next], starts)[0] != ""; next++ {
				cells := cutAt(lines[next], starts)
				if len(cells) == 1 {
					out = append(out, shown{s.Title, head[0], cells[0]})
				}
				for i, c := range cells[1:] {
					out = append(out, shown{s.Title, head[i+1], c})
				}
			}
		}
	}
	return out
}

// startsOf is where the columns of a table's head begin, in runes.
func startsOf(head string) (starts []int) {
	runes := []rune(head)
	for i, r := range runes {
		if r != ' ' && (i < 2 || runes[i-1] == ' ' && runes[i-2] == ' ') {
			starts = append(starts, i)
		}
	}
	return starts
}

func cutAt(line string, starts []int) (cells []string) {
	runes := []rune(line)
	for n, from := range starts {
		to := len(runes)
		if n+1 < len(starts) {
			to = min(to, starts[n+1])
		}
		if from >= len(runes) {
			break
		}
		cells = append(cells, strings.TrimSpace(string(runes[from:to])))
	}
	return cells
}

// ofHTML reads the figures of the page, which is well-formed enough for an XML reader.
func ofHTML(t *testing.T, text string) (out []shown) {
	t.Helper()
	d := xml.NewDecoder(strings.NewReader(text))
	d.Entity, d.AutoClose = xml.HTMLEntity, xml.HTMLAutoClose
	var path []string
	var title, words string
	var head, cells []string
	for {
		token, err := d.Token()
		if errors.Is(err, io.EOF) {
			return out
		}
		if err != nil {
			t.Fatalf("the page is not well-formed: %v", err)
		}
		switch e := token.(type) {
		case xml.StartElement:
			path, words = append(path, e.Name.Local), ""
			if e.Name.Local == "table" {
				head = nil
			}
			if e.Name.Local == "tr" {
				cells = nil
			}
			if e.Name.Local == "script" || e.Name.Local == "link" || e.Name.Local == "iframe" {
				t.Errorf("the page has a <%s>", e.Name.Local)
			}
			for _, a := range e.Attr {
				if strings.HasPrefix(a.Name.Local, "on") || a.Name.Local == "href" || a.Name.Local == "src" {
					t.Errorf("the page has %s=%q", a.Name.Local, a.Value)
				}
			}
		case xml.CharData:
			words += string(e)
		case xml.EndElement:
			path = path[:len(path)-1]
			switch e.Name.Local {
			case "h2":
				title = words
			case "th", "td":
				cells = append(cells, words)
			case "tr":
				switch {
				case slices.Contains(path, "thead"):
					head = cells
				case head == nil:
					out = append(out, shown{title, cells[0], cells[1]})
				case len(cells) == 1:
					out = append(out, shown{title, head[0], cells[0]})
				default:
					for i, c := range cells[1:] {
						out = append(out, shown{title, head[i+1], c})
					}
				}
			}
		}
	}
}
