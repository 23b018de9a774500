package main

import (
	"os"
	"strings"
	"testing"
)

// A verdict is explained by the groups of the day on which it was given, whatever the register says now; and the ledger stays
// whole, because the groups are part of the recorded settings.
func TestRegisterOfThen(t *testing.T) {
	t.Chdir(t.TempDir())
	write := func(name, text string) {
		t.Helper()
		if err := os.WriteFile(name, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	strayd := func(args ...string) string {
		t.Helper()
		var out, errs strings.Builder
		if code := run(t.Context(), args, &out, &errs); code != 0 {
			t.Fatalf("%v: exit %d, %s%s", args, code, out.String(), errs.String())
		}
		return out.String()
	}
	if err := os.Mkdir("inbox", 0o755); err != nil {
		t.Fatal(err)
	}
	write("strayd.yaml", "ledger: l.db\nseries: series.csv\nfeeds: [{name: a, files: \"inbox/*.csv\"}]\ngroups: [{name: equity}, {name: bond}]\n"+
		"ranges: [{name: own, for: [equity]}]\n")
	write("series.csv", "series,group\nalder,equity\n")
	rows := []string{"date,series,return"}
	for day := 1; day <= 28; day++ {
		rows = append(rows, strings.ReplaceAll("2026-02-DD,alder,0.00", "DD", twoDigits(day))+string(rune('1'+day%3)))
	}
	rows[28] = "2026-02-28,alder,0.5"
	write("inbox/a.csv", strings.Join(rows, "\n")+"\n")
	strayd("init")
	strayd("pass", "--settled", "--now", "2026-03-01")
	before := strayd("explain", "1", "--format", "json")
	write("series.csv", "series,group\nalder,bond\n")
	if now := strayd("explain", "1", "--format", "json"); now != before {
		t.Errorf("moved to another group, ref 1 is explained as\n%s\nand was as\n%s", now, before)
	}
	if !strings.Contains(strayd("history", "alder", "--format", "csv"), ",own,") {
		t.Error("moved to another group, the history is gone")
	}
	strayd("ledger", "verify")
	write("inbox/b.csv", "date,series,return\n2026-03-02,alder,0.01\n")
	strayd("pass", "--settled", "--now", "2026-03-03")
	strayd("ledger", "verify")
	if now := strayd("explain", "1", "--format", "json"); now != before {
		t.Errorf("after a pass under the new register, ref 1 is explained as\n%s\nand was as\n%s", now, before)
	}
}

func twoDigits(n int) string { return string([]byte{byte('0' + n/10), byte('0' + n%10)}) }
