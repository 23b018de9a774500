package parquet

import (
	"fmt"
	"io"
	"strconv"

	pq "github.com/parquet-go/parquet-go"

	"strayd/watcher"
)

// batch is how many rows are taken from the library at a time.
const batch = 512

// grid is an open table.
type grid struct {
	names  []string
	leaves []leaf
	groups []pq.RowGroup
	rows   pq.Rows // of the group being read, nil between groups
	buf    []pq.Row
	have   []pq.Row // of buf, not yet given out
	cells  []watcher.GridCell
	row    int // of the last row given out; -1 before the header
	done   int // rows of the group that were taken
}

// Open opens a table. Its header is no row of its own, and the first row is row 1.
func Open(file io.ReaderAt, size int64, table string, bounds watcher.GridBounds) (watcher.Grid, error) {
	if table != "" {
		return nil, unfit("a Parquet file has no sheets, and sheet is %q", table)
	}
	if err := checkEnds(file, size); err != nil {
		return nil, err
	}
	g := &grid{row: -1}
	err := guarded(func() error {
		f, err := pq.OpenFile(file, size, pq.SkipPageIndex(true), pq.SkipBloomFilters(true))
		if err != nil {
			return err
		}
		var optional []bool
		for _, c := range f.Root().Columns() {
			l, err := leafOf(c)
			if err != nil {
				return err
			}
			g.leaves, g.names = append(g.leaves, l), append(g.names, c.Name())
			optional = append(optional, c.Optional())
		}
		if len(g.leaves) > bounds.Columns {
			return unfit("the table has more than %d columns, the limit", bounds.Columns)
		}
		g.groups = f.RowGroups()
		return (&guard{file: file, size: size, bounds: bounds, optional: optional}).check(f.Metadata(), len(g.leaves))
	})
	if err != nil {
		return nil, err
	}
	return g, nil
}

// Next implements watcher.Grid.
func (g *grid) Next() ([]watcher.GridCell, int, error) {
	g.cells = g.cells[:0]
	g.row++
	if g.row == 0 {
		for _, name := range g.names {
			g.cells = append(g.cells, watcher.GridCell{Text: name})
		}
		return g.cells, 0, nil
	}
	if len(g.have) == 0 {
		if err := guarded(g.fill); err != nil {
			return nil, 0, err
		}
	}
	row := g.have[0]
	g.have = g.have[1:]
	for i, v := range row {
		g.cells = append(g.cells, g.leaves[i](v))
	}
	return g.cells, g.row, nil
}

// fill takes the next rows from the library.
func (g *grid) fill() error {
	for {
		if g.rows == nil {
			if len(g.groups) == 0 {
				return io.EOF
			}
			g.rows, g.done = g.groups[0].Rows(), 0
		}
		if g.buf == nil {
			g.buf = make([]pq.Row, batch)
		}
		n, err := g.rows.ReadRows(g.buf)
		g.have, g.done = g.buf[:n], g.done+n
		if err != nil && err != io.EOF {
			return err
		}
		for _, row := range g.have {
			if len(row) != len(g.leaves) {
				return unfit("the Parquet file is damaged: a row has %d cells, the table %d columns", len(row), len(g.leaves))
			}
		}
		if err == io.EOF {
			if want := g.groups[0].NumRows(); int64(g.done) != want {
				return unfit("the Parquet file is damaged: a row group has %d rows and says %d", g.done, want)
			}
			if err := g.rows.Close(); err != nil {
				return err
			}
			g.rows, g.groups = nil, g.groups[1:]
		}
		if n > 0 {
			return nil
		}
		if err == nil {
			return unfit("the Parquet file is damaged: a row group gives no more rows")
		}
	}
}

// Place implements watcher.Grid.
func (g *grid) Place(row, column int) string {
	at := ""
	if column >= 0 && column < len(g.names) {
		at = fmt.Sprintf("column %q", g.names[column])
	}
	if row <= 0 {
		return at
	}
	if at != "" {
		at = ", " + at
	}
	return "row " + strconv.Itoa(row) + at
}

// From1904 implements watcher.Grid.
func (*grid) From1904() bool { return false }

// Notes implements watcher.Grid.
func (*grid) Notes() []string { return nil }

// Close implements watcher.Grid.
func (g *grid) Close() error {
	if g.rows == nil {
		return nil
	}
	return guarded(g.rows.Close)
}
