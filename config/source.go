package config

import (
	"bytes"
	"errors"
	"io"
	"regexp"
	"strconv"
	"strings"
	"unicode/utf8"

	"gopkg.in/yaml.v3"
)

// document checks the text and gives its one document, or nil after recording why there is none.
func (d *decoder) document(data []byte) *yaml.Node {
	if len(data) > largest {
		d.fail("", at(1, 1), trouble{message: "the file is too large", got: "more than 1 MiB", want: "1 MiB or less"})
		return nil
	}
	data = bytes.TrimPrefix(data, []byte("\ufeff"))
	if !utf8.Valid(data) {
		line, col := invalid(data)
		d.fail("", at(line, col), trouble{message: "the file is not UTF-8 text", want: "UTF-8"})
		return nil
	}
	lines := lineBreak.Split(string(data), -1)
	d.text(lines)
	dec := yaml.NewDecoder(bytes.NewReader(data))
	doc, err := decode(dec)
	switch {
	case errors.Is(err, io.EOF):
		d.fail("", at(1, 1), trouble{message: "the file is empty", want: "at least ledger, one feed and one range"})
	case err != nil:
		d.syntax(lines, err)
	case d.single(dec, lines):
		return doc.Content[0]
	}
	return nil
}

var lineBreak = regexp.MustCompile(`\r\n|\n|\r`)

func at(line, col int) *yaml.Node { return &yaml.Node{Line: line, Column: col} }

func invalid(data []byte) (line, col int) {
	i := 0
	for i < len(data) {
		r, size := utf8.DecodeRune(data[i:])
		if r == utf8.RuneError && size == 1 {
			break
		}
		i += size
	}
	before := data[:i]
	return 1 + bytes.Count(before, []byte("\n")), 1 + utf8.RuneCount(before[bytes.LastIndexByte(before, '\n')+1:])
}

// decode reads the next document; a panic of the library on unforeseen text is a syntax error like any other.
func decode(dec *yaml.Decoder) (doc *yaml.Node, err error) {
	defer func() {
		if recover() != nil {
			err = errors.New("yaml: the text cannot be read")
		}
	}()
	doc = &yaml.Node{}
	if err := dec.Decode(doc); err != nil {
		return nil, err
	}
	if len(doc.Content) != 1 {
		return nil, io.EOF
	}
	return doc, nil
}

// single says that nothing follows the first document.
func (d *decoder) single(dec *yaml.Decoder, lines []string) bool {
	second, err := decode(dec)
	switch {
	case errors.Is(err, io.EOF):
		return true
	case err != nil:
		d.syntax(lines, err)
		return false
	}
	d.fail("", second, trouble{message: "a second document", want: "one document a file", hint: "remove the --- line and what follows"})
	return true
}

// text refuses what is wrong whatever the structure says: secrets, and tabs that indent.
func (d *decoder) text(lines []string) {
	for i, line := range lines {
		if at := secret.FindStringIndex(line); at != nil {
			d.fail("", &yaml.Node{Line: i + 1, Column: column(line, at[0])}, trouble{message: "a secret in the configuration",
				hint: "take it out, give it in the environment, a file or the credentials folder, and replace it where it was issued"})
		}
		indent := line[:len(line)-len(strings.TrimLeft(line, " \t"))]
		if tab := strings.IndexByte(indent, '\t'); tab >= 0 && len(indent) < len(line) {
			d.fail("", at(i+1, tab+1), trouble{message: "a tab indents the line", got: "a tab", want: "spaces"})
		}
	}
}

func column(line string, byteAt int) int { return 1 + utf8.RuneCountInString(line[:byteAt]) }

var yamlLine = regexp.MustCompile(`^yaml: (?:line \d+: )?`)

// syntax records an error of the YAML library. Its own line is that of the structure around the error, may be missing, and comes
// without a column; the place given here is the first line with which the text goes wrong.
func (d *decoder) syntax(lines []string, err error) {
	text := yamlLine.ReplaceAllString(err.Error(), "")
	line := firstBad(lines, text)
	if d.tabbed(line) {
		return
	}
	t := trouble{message: "not YAML: " + text}
	n, char := suspect(lines, line)
	if char != "" {
		t.got = char + " outside quotes"
		t.hint = "put the value in quotes"
	}
	d.fail("", n, t)
}

// mostWork is how many bytes at most are parsed again to find the line of an error.
const mostWork = 20 << 20

// firstBad is the first line of those that, once the text reaches it, bring the error up to the end of the text.
func firstBad(lines []string, message string) int {
	work := 0
	for n := len(lines); n > 1; n-- {
		text := strings.Join(lines[:n-1], "\n")
		work += len(text)
		if work > mostWork || problem(text) != message {
			return n
		}
	}
	return 1
}

// problem is what the YAML library says against a text, "" for nothing.
func problem(text string) string {
	dec := yaml.NewDecoder(strings.NewReader(text))
	for {
		if _, err := decode(dec); errors.Is(err, io.EOF) {
			return ""
		} else if err != nil {
			return yamlLine.ReplaceAllString(err.Error(), "")
		}
	}
}

// tabbed says whether the line already has its error, about a tab.
func (d *decoder) tabbed(line int) bool {
	for _, f := range d.faults {
		if f.Got == "a tab" && f.Line == line {
			return true
		}
	}
	return false
}

// special finds a character that YAML keeps for itself: at the start of a value, or a ? within a list in brackets.
var special = regexp.MustCompile("(?:^|[:,\\[{-])[ \\t]*([@%`*&!])[^ ]|\\[[^\\]]*?(\\?)")

// suspect is the place of a special character in a line, or else the line's first character.
func suspect(lines []string, line int) (n *yaml.Node, char string) {
	text := lines[line-1]
	for _, m := range special.FindAllStringSubmatchIndex(text, -1) {
		if from := max(m[2], m[4]); !inQuotes(text[:from]) {
			return at(line, column(text, from)), strconv.Quote(text[from : from+1])
		}
	}
	return at(line, 1+len(text)-len(strings.TrimLeft(text, " \t"))), ""
}

func inQuotes(before string) bool {
	return strings.Count(before, `"`)%2 == 1 || strings.Count(before, "'")%2 == 1 || strings.Contains(before, " #") ||
		strings.HasPrefix(before, "#")
}
