package main

import (
	"errors"
	"fmt"
	"os"
	"os/exec"
	"strconv"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"

	"strayd/watcher/ledger"
)

// The scripts of testdata/script are the specification of the commands as their users see them. Beside the commands of testscript
// they have
//
//	strayd ARGS        runs the program, which must exit with 0
//	exits CODE ARGS    runs it, and it must exit with the code
//	held CODE ARGS     the same while another process holds ledger.db
func TestScripts(t *testing.T) {
	program, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	exits := func(ts *testscript.TestScript, code string, args []string) {
		if got := exitOf(ts.Exec(program, args...)); strconv.Itoa(got) != code {
			ts.Fatalf("strayd %q exits with %d, want %s\n%s%s", args, got, code, ts.ReadFile("stdout"), ts.ReadFile("stderr"))
		}
	}
	testscript.Run(t, testscript.Params{
		Dir:                 "testdata/script",
		RequireExplicitExec: true,
		RequireUniqueNames:  true,
		UpdateScripts:       os.Getenv("STRAYD_UPDATE") != "",
		Setup: func(e *testscript.Env) error {
			e.Setenv(asProgram, "1")
			return nil
		},
		Cmds: map[string]func(ts *testscript.TestScript, neg bool, args []string){
			"strayd": func(ts *testscript.TestScript, neg bool, args []string) { exits(ts, unless(ts, neg, "0"), args) },
			"exits": func(ts *testscript.TestScript, neg bool, args []string) {
				exits(ts, unless(ts, neg, args[0]), args[1:])
			},
			"held": func(ts *testscript.TestScript, neg bool, args []string) {
				l, err := ledger.Open(ts.MkAbs("ledger.db"), ledger.Options{})
				ts.Check(err)
				defer func() { ts.Check(l.Close()) }()
				exits(ts, unless(ts, neg, args[0]), args[1:])
			},
		},
	})
}

// unless refuses the "!" in front of a command that states its exit code.
func unless(ts *testscript.TestScript, neg bool, code string) string {
	if neg {
		ts.Fatalf("say the exit code: exits CODE ARGS")
	}
	return code
}

func exitOf(err error) int {
	var exit *exec.ExitError
	switch {
	case err == nil:
		return 0
	case errors.As(err, &exit):
		return exit.ExitCode()
	}
	panic(fmt.Sprintf("strayd did not run: %v", err))
}
