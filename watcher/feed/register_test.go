package feed

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"reflect"
	"testing"

	"strayd/rules"
)

func day(t *testing.T, s string) rules.Date {
	t.Helper()
	d, err := rules.ParseDate(s)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func tableFile(t *testing.T, name, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

func TestRegister(t *testing.T) {
	got, err := ReadRegister(tableFile(t, "series.csv", "\ufeffgroup,series,end,start,reference,name,owner,fx,calendar\r\n"+
		"equity, ALDER-1 ,,2020-01-02,INDEX-1,\"Alder, large \"\"caps\"\"\",desk-one,USDEUR,weekdays\r\n\r\n,BIRCH,2024-01-31,2023-02-01,none,,,,\r\n"))
	want := []rules.Series{
		{ID: "ALDER-1", Name: `Alder, large "caps"`, Group: "equity", Reference: "INDEX-1", FX: "USDEUR", Calendar: "weekdays", Owner: "desk-one",
			Start: day(t, "2020-01-02"), End: rules.NoDate},
		{ID: "BIRCH", Reference: "none", Start: day(t, "2023-02-01"), End: day(t, "2024-01-31")},
	}
	if err != nil || !reflect.DeepEqual(got, want) {
		t.Errorf("got %+v, %v", got, err)
	}
	got, err = ReadRegister(tableFile(t, "series.csv", "series\nA"))
	if want := []rules.Series{{ID: "A", Start: rules.NoDate, End: rules.NoDate}}; err != nil || !reflect.DeepEqual(got, want) {
		t.Errorf("got %+v, %v", got, err)
	}
}

func TestEvents(t *testing.T) {
	got, err := ReadEvents(tableFile(t, "events.csv", "date,series,kind,amount\n2024-03-15,ALDER-1,distribution,0.0125\n2024-04-02,BIRCH,split,1e1\n"))
	want := []rules.Event{{Date: day(t, "2024-03-15"), Series: "ALDER-1", Kind: "distribution", Amount: 0.0125},
		{Date: day(t, "2024-04-02"), Series: "BIRCH", Kind: "split", Amount: 10}}
	if err != nil || !reflect.DeepEqual(got, want) {
		t.Errorf("got %+v, %v", got, err)
	}
}

func TestBrokenTables(t *testing.T) {
	check := func(text, want string) {
		t.Helper()
		if _, err := ReadRegister(tableFile(t, "series.csv", text)); err == nil || err.Error() != want {
			t.Errorf("got  %v\nwant %s", err, want)
		}
	}
	check("", "series.csv: the file is empty")
	check("\n \n", "series.csv: the file is empty")
	check("name,group\nA,b\n", `series.csv:1: the header has no column "series"; it has: "name, group"`)
	check("series,refrence\nA,b\n", `series.csv:1:8: unknown column; known are series, name, group, reference, fx, calendar, start, end, owner: "refrence"`)
	check("series,group,group\nA,b,c\n", `series.csv:1:14: the header has this column twice: "group"`)
	check("series,\nA,\n", `series.csv:1:8: unknown column; known are series, name, group, reference, fx, calendar, start, end, owner`)
	check("series,group\nA\n", "series.csv:2: the line has 1 cells, the header has 2")
	check("series,group\nA,b\n\n,c\n", "series.csv:4:1: the name of the series is empty")
	check("series,group\nA,b\nB,c\nA,d\n", `series.csv:4:1: the series stands on line 2 already: "A"`)
	check("series,start\nA,02.01.2024\n", `series.csv:2:3: date is not written YYYY-MM-DD: "02.01.2024"`)
	check("series,start,end\nA,2024-01-02,2024-01-01\n", `series.csv:2:14: the end lies before the start: "2024-01-01"`)
	check("series,name\nA,\"b\nB,c\n", `series.csv:2:3: a quoted cell is never closed: "b\nB,c\n"`)
	check("series,name\nA,\xfc\n", `series.csv:2:3: the cell is not valid UTF-8; is the feed's encoding right?: "\xfc"`)
	check("\xff\xfes\x00", "series.csv: the file is UTF-16; declare encoding: utf-16")
	check("series\rA\r", "series.csv:1:1: "+carriageReturn+`: "series\rA"`)
	events := func(row, want string) {
		t.Helper()
		if _, err := ReadEvents(tableFile(t, "events.csv", "date,series,kind,amount\n"+row+"\n")); err == nil || err.Error() != "events.csv:2:"+want {
			t.Errorf("got  %v\nwant events.csv:2:%s", err, want)
		}
	}
	events(",A,split,2", "1: the date is empty")
	events("2024-01-02,,split,2", "12: the name of the series is empty")
	events("2024-01-02,A,merger,2", `14: the kind is neither distribution nor split: "merger"`)
	events("2024-01-02,A,split,0", `20: the amount must be above zero: "0"`)
	events("2024-01-02,A,split,two", `20: the value is not a number: "two"`)
	events("2024-01-02,A,distribution,1.5", `27: a distribution is a fraction of the net asset value and lies below 1: "1.5"`)
	if _, err := ReadRegister(filepath.Join(t.TempDir(), "none.csv")); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("no file: %v", err)
	}
}
