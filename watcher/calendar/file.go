package calendar

import (
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"os"
	"slices"
	"strings"

	"strayd/rules"
)

// fileBytes is how large a file of days may be.
const fileBytes = 1 << 20

// read reads a file of days: CSV with the columns date (YYYY-MM-DD) and, where wanted, day (closed or open; closed when blank) and
// name. Errors give file:line.
func read(path, name string) (closed, open []rules.Date, err error) {
	file, err := os.Open(path)
	if err != nil {
		return nil, nil, fmt.Errorf("calendar %q is no week, no nation's code and no file that can be read: %w", name, err)
	}
	defer file.Close()
	r := csv.NewReader(io.LimitReader(file, fileBytes))
	r.TrimLeadingSpace = true
	header, err := r.Read()
	if err != nil {
		return nil, nil, fmt.Errorf("calendar %s: no header: %w", name, err)
	}
	header[0] = strings.TrimPrefix(header[0], "\ufeff")
	date, day := slices.Index(header, "date"), slices.Index(header, "day")
	for _, column := range header {
		if column != "date" && column != "day" && column != "name" {
			return nil, nil, fmt.Errorf("calendar %s:1: unknown column %q; known are date, day, name", name, column)
		}
	}
	if date < 0 {
		return nil, nil, fmt.Errorf("calendar %s:1: no column date", name)
	}
	for {
		row, err := r.Read()
		if errors.Is(err, io.EOF) {
			return closed, open, nil
		}
		if err != nil {
			return nil, nil, fmt.Errorf("calendar %s: %w", name, err)
		}
		line, _ := r.FieldPos(date)
		d, err := rules.ParseDate(row[date])
		kind := "closed"
		if day >= 0 && row[day] != "" {
			kind = row[day]
		}
		switch {
		case err != nil:
			return nil, nil, fmt.Errorf("calendar %s:%d: %w", name, line, err)
		case kind == "closed":
			closed = append(closed, d)
		case kind == "open":
			open = append(open, d)
		default:
			return nil, nil, fmt.Errorf("calendar %s:%d: day %q is neither closed nor open", name, line, kind)
		}
	}
}
