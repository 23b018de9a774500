package main

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"strayd/rules/drill"
)

// indexData is where the open index series lie, seen from the top of the source.
const indexData = "testdata/reference/data"

// indexDays is how many dates of them a book takes.
const indexDays = 750

// writeBook writes one of the books of funds.
func writeBook(kind, out string, seed uint64) error {
	if out == "" {
		return fmt.Errorf("-book %s needs -out FOLDER", kind)
	}
	i, err := invention(kind, seed)
	if err != nil {
		return err
	}
	return funds(out, i)
}

// invention is what the word for a book of funds stands for.
func invention(kind string, seed uint64) (i drill.Invention, err error) {
	i.Seed = seed
	switch kind {
	case "funds":
	case "funds-fx":
		i.FX = true
	case "funds-index":
		i.Factors, err = indexFactors(indexData, seed, indexDays)
	default:
		err = fmt.Errorf("no book %q; there are funds, funds-fx, funds-index", kind)
	}
	return i, err
}

// funds writes an invented book of funds as files: configuration, register, events, and one file a date and feed, so that anyone can run
// passes and drills on it.
func funds(out string, i drill.Invention) error {
	b := drill.Invent(i)
	if err := writeSetup(out, b); err != nil {
		return err
	}
	for t, date := range b.Dates {
		for _, feed := range []string{drill.BenchFeed, drill.FundsFeed} {
			text, _ := b.Text(feed, t, t+1)
			if err := os.WriteFile(filepath.Join(out, "inbox", fmt.Sprintf("%s-%s.csv", feed, date)), []byte(text), 0o644); err != nil {
				return err
			}
		}
	}
	return nil
}

// writeSetup writes the configuration, register and events of a book, and makes its inbox.
func writeSetup(out string, b *drill.Book) error {
	if err := os.MkdirAll(filepath.Join(out, "inbox"), 0o755); err != nil {
		return err
	}
	for name, text := range map[string]string{"strayd.yaml": drill.InventedConfig, "series.csv": b.RegisterText(), "events.csv": b.EventsText()} {
		if err := os.WriteFile(filepath.Join(out, name), []byte(text), 0o644); err != nil {
			return err
		}
	}
	return nil
}

// indexFactors reads the four open index series as factors of groups: simple returns, of as many dates as are asked for, from a place that
// the seed gives. The data lie in a folder with a licence of its own, and nothing of them is kept here.
func indexFactors(dir string, seed uint64, dates int) ([][]float64, error) {
	data, err := os.ReadFile(filepath.Join(dir, "eustockmarkets_prices.csv"))
	if err != nil {
		return nil, err
	}
	r := csv.NewReader(bytes.NewReader(data))
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		return nil, err
	}
	prices, err := priceColumns(rows, []string{"DAX", "SMI", "CAC", "FTSE"})
	if err != nil {
		return nil, err
	}
	var out [][]float64
	for _, p := range prices {
		from := 0
		if room := len(p) - 1 - dates; room > 0 {
			from = int(seed * 131 % uint64(room))
		}
		var f []float64
		for t := from + 1; t < len(p) && len(f) < dates; t++ {
			f = append(f, p[t]/p[t-1]-1)
		}
		out = append(out, f)
	}
	return out, nil
}

func priceColumns(rows [][]string, names []string) (out [][]float64, err error) {
	if len(rows) == 0 {
		return nil, fmt.Errorf("the prices are empty")
	}
	for _, name := range names {
		at := slices.Index(rows[0], name)
		if at < 0 {
			return nil, fmt.Errorf("no column %s, have %s", name, strings.Join(rows[0], ", "))
		}
		var p []float64
		for n, row := range rows[1:] {
			v, err := strconv.ParseFloat(row[at], 64)
			if err != nil {
				return nil, fmt.Errorf("row %d, column %s: %w", n+1, name, err)
			}
			p = append(p, v)
		}
		out = append(out, p)
	}
	return out, nil
}
