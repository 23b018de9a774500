package main

import (
	"errors"
	"fmt"
	"io"

	"strayd/watcher"
	"strayd/watcher/sample"
)

// mostSampleRows is how many rows of a workbook or table are looked at.
const mostSampleRows = 200_000

// gridSample looks into a file that is no text.
func gridSample(name string, file io.ReaderAt, size int64, open watcher.OpenGrid) (s *sample.Sample, err error) {
	g, err := open(file, size, "", watcher.GridBounds{Bytes: 8 << 30, Ratio: 200, Columns: 1024})
	if err != nil {
		return nil, unreadable(name, "", err)
	}
	defer func() { err = errors.Join(err, g.Close()) }()
	var rows []sample.Row
	percent := false
	for len(rows) < mostSampleRows {
		cells, line, err := g.Next()
		if err == io.EOF {
			break
		}
		if fault, ok := err.(*watcher.GridFault); ok && fault.Row >= 0 {
			return nil, unreadable(name, g.Place(fault.Row, fault.Column), err)
		} else if err != nil {
			return nil, unreadable(name, "", err)
		}
		row := sample.Row{Line: line}
		for _, c := range cells {
			text := c.Text
			if c.Kind == watcher.DateCell {
				text = c.Date.String()
			}
			percent = percent || c.Kind == watcher.PercentCell
			row.Cells = append(row.Cells, text)
		}
		rows = append(rows, row)
	}
	s, err = sample.Cells(name, rows, len(rows) == mostSampleRows)
	if s != nil {
		s.Percent = percent
	}
	return s, err
}

func unreadable(name, place string, err error) error {
	if place != "" {
		name += ":" + place
	}
	return fmt.Errorf("%s: %w", name, err)
}
