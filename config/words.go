package config

import (
	"errors"
	"regexp"
	"strconv"
	"strings"

	"gopkg.in/yaml.v3"
)

// word is one of the texts that a value may be, and what it stands for.
type word[T any] struct {
	text  string
	means T
}

// words is a value from a fixed list.
func words[T any](list ...word[T]) shape {
	texts := make([]string, len(list))
	for i, w := range list {
		texts[i] = w.text
	}
	return scalar[T]{what: "one of " + spelled(texts), json: map[string]any{"enum": texts},
		parse: func(_ *decoder, n *yaml.Node) (T, error) {
			for _, w := range list {
				if w.text == n.Value && n.ShortTag() == "!!str" {
					return w.means, nil
				}
			}
			var none T
			return none, trouble{message: "not an allowed word", want: nearest(n.Value, texts)}
		}}
}

// named is a list of words that stand for themselves.
func named[T ~string](list ...T) shape {
	pairs := make([]word[T], len(list))
	for i, w := range list {
		pairs[i] = word[T]{string(w), w}
	}
	return words(pairs...)
}

// spelled lists words; those that would not be seen otherwise are quoted.
func spelled(texts []string) string {
	shown := make([]string, len(texts))
	for i, t := range texts {
		shown[i] = t
		if strings.ContainsAny(t, " \t.,;|") {
			shown[i] = strconv.Quote(t)
		}
	}
	return strings.Join(shown, ", ")
}

const (
	clockPattern  = `^([01][0-9]|2[0-3]):[0-5][0-9]$`
	hoursPattern  = `^([01][0-9]|2[0-3]):[0-5][0-9]-(([01][0-9]|2[0-3]):[0-5][0-9]|24:00)$`
	budgetPattern = `^(0|[1-9][0-9]*)(\.[0-9]+)? a week$`
)

var (
	clockText  = regexp.MustCompile(clockPattern)
	hoursText  = regexp.MustCompile(hoursPattern)
	budgetText = regexp.MustCompile(budgetPattern)
)

// clock is a time of day, as minutes since midnight.
func clock() shape {
	return scalar[int]{what: `a time of day such as "09:30"`, json: map[string]any{"type": "string", "pattern": clockPattern},
		parse: func(_ *decoder, n *yaml.Node) (int, error) {
			if !clockText.MatchString(n.Value) {
				return 0, errors.New("not a time of day")
			}
			return minutes(n.Value), nil
		}}
}

// minutes of "HH:MM", which is known to be well formed.
func minutes(s string) int {
	hour, _ := strconv.Atoi(s[:2])
	minute, _ := strconv.Atoi(s[3:5])
	return 60*hour + minute
}

// span is a part of the day, in minutes since midnight; it may run over midnight.
type span struct{ from, to int }

func hours() shape {
	return scalar[span]{what: `a part of the day such as "07:00-19:00"`, json: map[string]any{"type": "string", "pattern": hoursPattern},
		parse: func(_ *decoder, n *yaml.Node) (span, error) {
			if !hoursText.MatchString(n.Value) {
				return span{}, errors.New("not a part of the day")
			}
			s := span{minutes(n.Value[:5]), minutes(n.Value[6:])}
			if s.from == s.to {
				return span{}, trouble{message: "no time at all", hint: "leave hours out for always"}
			}
			return s, nil
		}}
}

// budget is how many flags a week are acceptable.
func budget() shape {
	return scalar[float64]{what: "a number of flags a week above 0, such as 2 a week", json: map[string]any{"type": "string", "pattern": budgetPattern},
		parse: func(_ *decoder, n *yaml.Node) (float64, error) {
			if !budgetText.MatchString(n.Value) {
				return 0, errors.New("not a budget")
			}
			return bounded(strings.TrimSuffix(n.Value, " a week"), "", bounds{low: 0, high: 1e6, openLow: true})
		}}
}
