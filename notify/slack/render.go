package slack

import (
	"fmt"
	"strings"
	"unicode/utf16"

	"github.com/slack-go/slack"
)

// Bounds of a message, each below the service's own, in characters as it counts them: after escaping, an emoji as two.
const (
	textMost    = 3500
	headerMost  = 140
	sectionMost = 2900
	totalMost   = 10000 // which leaves far fewer than the 50 blocks that the service takes
)

// fallback is the text of a message: what notifications show and screen readers read.
func fallback(lines []string) string { return escaped(strings.Join(lines, "\n"), textMost) }

// blocks lays the lines out: the first as a header where it is short enough, the others as sections. All of it is plain text, in
// which nothing is markup.
func blocks(lines []string) []slack.Block {
	var out []slack.Block
	if len(lines) > 0 {
		if head := escaped(lines[0], sectionMost); size(head) <= headerMost {
			out = append(out, slack.NewHeaderBlock(plain(head)))
			lines = lines[1:]
		}
	}
	for _, s := range sections(lines, totalMost-headerMost) {
		out = append(out, slack.NewSectionBlock(plain(s), nil, nil))
	}
	return out
}

// sections joins escaped lines into as few texts as the bounds allow. Lines for which there is no room are counted.
func sections(lines []string, room int) []string {
	var out []string
	const note = 60 // room for the count
	for i, l := range lines {
		l = escaped(l, sectionMost)
		n := len(out) - 1
		joins := n >= 0 && size(out[n])+1+size(l) <= sectionMost
		if room -= size(l) + 1; room < note {
			return append(out, fmt.Sprintf("and %d more lines: strayd notices", len(lines)-i))
		}
		if joins {
			out[n] += "\n" + l
			continue
		}
		out = append(out, l)
	}
	return out
}

func plain(text string) *slack.TextBlockObject {
	if text == "" {
		text = " " // the service takes no empty text
	}
	return slack.NewTextBlockObject(slack.PlainTextType, text, false, false)
}

// escaped writes &, < and > so that the service takes none of them for markup, and cuts the result to a size, never within such an
// escape, ending it with dots.
func escaped(s string, most int) string {
	var b strings.Builder
	used, fits := 0, 0 // size so far, and length of what leaves room for the dots
	for _, r := range s {
		e := escape(r)
		used += size(e)
		if used > most {
			return b.String()[:fits] + "..."
		}
		b.WriteString(e)
		if used <= most-3 {
			fits = b.Len()
		}
	}
	return b.String()
}

func escape(r rune) string {
	switch r {
	case '&':
		return "&amp;"
	case '<':
		return "&lt;"
	case '>':
		return "&gt;"
	}
	return string(r)
}

func size(s string) (n int) {
	for _, r := range s {
		n += max(1, utf16.RuneLen(r))
	}
	return n
}
