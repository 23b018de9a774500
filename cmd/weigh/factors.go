package main

import (
	"encoding/csv"
	"fmt"
	"os"
	"path/filepath"
	"strconv"
)

// indices are the files of the open data whose returns may stand in for invented factors, in testdata/reference/data.
var indices = []string{"eustock_dax.csv", "eustock_smi.csv", "eustock_cac.csv", "eustock_ftse.csv"}

const (
	bookDays = 750
	stride   = 137 // from one book's first day to the next one's
)

// readFactors reads the daily returns of the indices in a folder, by index then day.
func readFactors(folder string) ([][]float64, error) {
	var all [][]float64
	for _, name := range indices {
		f, err := os.Open(filepath.Join(folder, name))
		if err != nil {
			return nil, err
		}
		r := csv.NewReader(f)
		r.Comment = '#'
		rows, err := r.ReadAll()
		if err = firstOf(err, f.Close()); err != nil {
			return nil, fmt.Errorf("%s: %w", name, err)
		}
		var returns []float64
		for _, row := range rows[1:] {
			v, err := strconv.ParseFloat(row[2], 64)
			if err != nil {
				return nil, fmt.Errorf("%s: %w", name, err)
			}
			returns = append(returns, v)
		}
		all = append(all, returns)
	}
	return all, nil
}

func firstOf(a, b error) error {
	if a != nil {
		return a
	}
	return b
}

// slice is the days of the factors that a seed's book takes.
func slice(factors [][]float64, seed uint64) [][]float64 {
	if factors == nil {
		return nil
	}
	from := int(seed*stride) % (len(factors[0]) - bookDays)
	out := make([][]float64, len(factors))
	for i, f := range factors {
		out[i] = f[from : from+bookDays]
	}
	return out
}
