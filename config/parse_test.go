package config

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	_ "time/tzdata" // so that the test needs no zone files on the machine

	"github.com/santhosh-tekuri/jsonschema/v6"
	"gopkg.in/yaml.v3"
)

// fakeCron stands in for the schedule's parser, which is another room's: it takes descriptors and five fields.
func fakeCron(spec string) error {
	if n := len(strings.Fields(spec)); n != 5 && !strings.HasPrefix(spec, "@") {
		return fmt.Errorf("%q has %d fields", spec, n)
	}
	return nil
}

var testOptions = Options{Cron: fakeCron}

func compiled(t testing.TB) *jsonschema.Schema {
	t.Helper()
	doc, err := jsonschema.UnmarshalJSON(bytes.NewReader(Schema()))
	if err != nil {
		t.Fatal(err)
	}
	c := jsonschema.NewCompiler()
	if err := c.AddResource("config.json", doc); err != nil {
		t.Fatal(err)
	}
	s, err := c.Compile("config.json")
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// asJSON is what an editor sees of a YAML file: its values as JSON.
func asJSON(data []byte) (any, error) {
	var v any
	if err := yaml.Unmarshal(data, &v); err != nil {
		return nil, err
	}
	if v == nil {
		return nil, errors.New("nothing in it")
	}
	text, err := json.Marshal(v)
	if err != nil {
		return nil, err
	}
	return jsonschema.UnmarshalJSON(bytes.NewReader(text))
}

func read(t testing.TB, path string) []byte {
	t.Helper()
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return data
}

// Every example passes the walker and the schema.
func TestExamples(t *testing.T) {
	schema := compiled(t)
	for _, path := range []string{"testdata/minimal.yaml", "testdata/example.yaml", "testdata/desk.yaml", "default.yaml"} {
		if _, err := Load(path, testOptions); err != nil {
			t.Errorf("%v", err)
		}
		v, err := asJSON(read(t, path))
		if err != nil {
			t.Fatal(err)
		}
		if err := schema.Validate(v); err != nil {
			t.Errorf("%s: %v", path, err)
		}
	}
}

// Every broken file has its errors, written by hand beside it, and the schema's verdict: rejects, passes (what only the walker
// sees), or unreadable (not even generic YAML turns into JSON).
func TestBroken(t *testing.T) {
	schema := compiled(t)
	paths, err := filepath.Glob("testdata/broken/*.yaml")
	if err != nil || len(paths) < 45 {
		t.Fatalf("%d broken files, %v", len(paths), err)
	}
	for _, path := range paths {
		data := read(t, path)
		verdict, want, _ := strings.Cut(string(read(t, strings.TrimSuffix(path, ".yaml")+".want")), "\n")
		_, err := Load(path, testOptions)
		if got := reported(t, path, err); got != want {
			t.Errorf("%s:\n got %swant %s", path, got, want)
		}
		if got := "schema " + schemaVerdict(schema, data); got != verdict {
			t.Errorf("%s: %s, want %s", path, got, verdict)
		}
	}
}

// reported is the errors without the file's name, one a line.
func reported(t *testing.T, path string, err error) string {
	t.Helper()
	var all Errors
	if !errors.As(err, &all) {
		t.Errorf("%s: %v, want Errors", path, err)
	}
	var b strings.Builder
	for _, e := range all {
		b.WriteString(strings.TrimPrefix(e.Error(), path+":") + "\n")
	}
	return b.String()
}

func schemaVerdict(s *jsonschema.Schema, data []byte) string {
	v, err := asJSON(data)
	switch {
	case err != nil:
		return "unreadable"
	case s.Validate(v) != nil:
		return "rejects"
	}
	return "passes"
}
