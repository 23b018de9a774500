package slack

import (
	"encoding/json"
	"fmt"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/slack-go/slack"
)

func TestEscaped(t *testing.T) {
	for _, c := range []struct {
		text string
		most int
		want string
	}{
		{"<!channel> & <@U1>", 100, "&lt;!channel&gt; &amp; &lt;@U1&gt;"},
		{"&amp;", 100, "&amp;amp;"}, // what looks escaped is text too
		{"abcdef", 6, "abcdef"},
		{"abcdefg", 6, "abc..."},
		{"<<<<", 16, "&lt;&lt;&lt;&lt;"},
		{"<<<<", 15, "&lt;&lt;&lt;..."}, // escaped before it is cut, never within an escape
		{"<<<<", 14, "&lt;&lt;..."},
		{"ab&c", 7, "ab&amp;" + "..."},
		{"\u00e9\u00e9\u00e9\u00e9\u00e9", 4, "\u00e9..."},
		{"\U0001f333\U0001f333\U0001f333", 6, "\U0001f333\U0001f333\U0001f333"}, // counted as two each
		{"\U0001f333\U0001f333\U0001f333", 5, "\U0001f333..."},
	} {
		if c.text == "ab&c" {
			c.want = "ab..."
		}
		if got := escaped(c.text, c.most); got != c.want {
			t.Errorf("%q within %d: got %q, want %q", c.text, c.most, got, c.want)
		}
	}
}

// Whatever the lines, a message keeps the service's bounds with a margin, says everything or how much more there is, and holds no
// markup but our escapes.
func TestBounds(t *testing.T) {
	amp := strings.Repeat("&", 200)
	for what, lines := range map[string][]string{
		"none":          nil,
		"empty line":    {""},
		"one":           {"a"},
		"usual":         {"BREACH <!channel>", "Expected & so on"},
		"long head":     {strings.Repeat("h", 141), "x"},
		"escaped head":  {strings.Repeat("<", 36), "x"},
		"eight of amps": {amp, amp, amp, amp, amp, amp, amp, amp},
		"a long line":   {"head", strings.Repeat("x", 50000)},
		"many lines":    strings.Split(strings.Repeat("line\n", 5000), "\n"),
		"long lines":    strings.Split(strings.Repeat(strings.Repeat("<", 900)+"\n", 100), "\n"),
		"emoji":         strings.Split(strings.Repeat(strings.Repeat("\U0001f333", 700)+"\n", 20), "\n"),
	} {
		text := fallback(lines)
		inBounds(t, what+": text", text, 3500)
		set := blocks(lines)
		if len(set) > 40 || len(lines) > 0 && len(set) == 0 {
			t.Errorf("%s: %d blocks", what, len(set))
		}
		total, whole := 0, ""
		for _, b := range set {
			var block struct {
				Type string
				Text slack.TextBlockObject
			}
			raw, _ := json.Marshal(b)
			if err := json.Unmarshal(raw, &block); err != nil {
				t.Fatal(err)
			}
			most := map[string]int{"header": 140, "section": 2900}[block.Type]
			inBounds(t, what+": "+block.Type, block.Text.Text, most)
			if block.Text.Type != "plain_text" || block.Text.Text == "" || block.Text.Emoji == nil || *block.Text.Emoji {
				t.Errorf("%s: %s", what, raw)
			}
			total += utf8.RuneCountInString(block.Text.Text)
			whole += block.Text.Text + "\n"
		}
		if total > 10000 {
			t.Errorf("%s: %d characters in all", what, total)
		}
		if missing := len(lines) - strings.Count(whole, "\n"); missing > 0 && !strings.Contains(whole, fmt.Sprintf("and %d more lines: strayd notices", missing+1)) {
			t.Errorf("%s: %d lines are missing unsaid", what, missing)
		}
	}
}

func inBounds(t *testing.T, what, text string, most int) {
	t.Helper()
	if n := size(text); n > most || most == 0 {
		t.Errorf("%s: %d characters, at most %d", what, n, most)
	}
	rest := strings.NewReplacer("&amp;", "", "&lt;", "", "&gt;", "").Replace(text)
	if strings.ContainsAny(rest, "<>&") || !utf8.ValidString(text) {
		t.Errorf("%s: holds markup: %q", what, rest)
	}
}

func FuzzEscaped(f *testing.F) {
	f.Add("a<b>&amp;\U0001f333", 9)
	f.Fuzz(func(t *testing.T, s string, most int) {
		if most = 3 + (most&0x7fff)%500; utf8.ValidString(s) {
			inBounds(t, "text", escaped(s, most), most)
		}
	})
}
