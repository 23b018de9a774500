package health

import (
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"unicode/utf8"
)

// exposition is a page of OpenMetrics text that was read strictly.
type exposition struct {
	kinds  map[string]string // of each family
	units  map[string]string
	helps  map[string]string
	values map[string]float64 // by name, or name{label="value"} with the value unescaped
}

var (
	metricName  = regexp.MustCompile(`^[a-zA-Z_:][a-zA-Z0-9_:]*$`)
	labelName   = regexp.MustCompile(`^[a-zA-Z_][a-zA-Z0-9_]*$`)
	realNumber  = regexp.MustCompile(`^[+-]?([0-9]+(\.[0-9]*)?|\.[0-9]+)([eE][+-]?[0-9]+)?$`)
	sampleLine  = regexp.MustCompile(`^([a-zA-Z0-9_:]+)(?:\{(.*)\})? ([^ ]+)$`)
	metricTypes = []string{"counter", "gauge", "histogram", "gaugehistogram", "stateset", "info", "summary", "unknown"}
	ends        = map[string][]string{"counter": {"_total", "_created"}, "info": {"_info"}, "gauge": {""}}
)

// readMetrics reads a page by the grammar and the rules of OpenMetrics 1.0 (the ABNF and the sections Metric Family, Text Format
// and Metric Types), as far as this program may use it: counters, gauges and infos without timestamps and exemplars.
func readMetrics(page string) (*exposition, error) {
	e := &exposition{map[string]string{}, map[string]string{}, map[string]string{}, map[string]float64{}}
	if !utf8.ValidString(page) {
		return nil, fmt.Errorf("not UTF-8")
	}
	body, ok := strings.CutSuffix(page, "# EOF\n")
	if !ok || (body != "" && !strings.HasSuffix(body, "\n")) {
		return nil, fmt.Errorf("no # EOF on a line of its own at the end")
	}
	family, sampled := "", false
	owners := map[string]string{} // sample name to family
	for i, line := range strings.SplitAfter(body, "\n") {
		if line == "" {
			continue
		}
		line = strings.TrimSuffix(line, "\n")
		var err error
		if strings.HasPrefix(line, "#") {
			family, sampled, err = e.descriptor(line, family, sampled)
		} else {
			sampled, err = true, e.sample(line, family, owners)
		}
		if err != nil {
			return nil, fmt.Errorf("line %d: %q: %w", i+1, line, err)
		}
	}
	return e, nil
}

func (e *exposition) descriptor(line, family string, sampled bool) (string, bool, error) {
	parts := strings.SplitN(line, " ", 4)
	if len(parts) != 4 || parts[0] != "#" || !metricName.MatchString(parts[2]) {
		return "", false, fmt.Errorf("no descriptor")
	}
	name, text := parts[2], parts[3]
	if name != family || sampled {
		if _, known := e.kinds[name]; known {
			return "", false, fmt.Errorf("family comes twice")
		}
		if parts[1] != "TYPE" {
			return "", false, fmt.Errorf("family does not begin with its type")
		}
	}
	switch parts[1] {
	case "TYPE":
		return name, false, put(e.kinds, name, text, strings.Contains(" "+strings.Join(metricTypes, " ")+" ", " "+text+" "))
	case "UNIT":
		return name, false, put(e.units, name, text, strings.HasSuffix(name, "_"+text) && e.kinds[name] != "info")
	case "HELP":
		_, err := unescape(text)
		return name, false, first(err, put(e.helps, name, text, text != ""))
	}
	return "", false, fmt.Errorf("unknown descriptor")
}

func put(m map[string]string, name, text string, fits bool) error {
	if _, twice := m[name]; twice || !fits {
		return fmt.Errorf("twice, or does not fit")
	}
	m[name] = text
	return nil
}

func first(errs ...error) error {
	for _, err := range errs {
		if err != nil {
			return err
		}
	}
	return nil
}

func (e *exposition) sample(line, family string, owners map[string]string) error {
	m := sampleLine.FindStringSubmatch(line)
	if m == nil || family == "" || !metricName.MatchString(m[1]) {
		return fmt.Errorf("no sample, or one before its family")
	}
	fits := false
	for _, end := range ends[e.kinds[family]] {
		fits = fits || m[1] == family+end
	}
	if owner, taken := owners[m[1]]; !fits || (taken && owner != family) {
		return fmt.Errorf("not a name of family %s", family)
	}
	owners[m[1]] = family
	id := m[1]
	if m[2] != "" {
		labels, err := readLabels(m[2])
		if err != nil {
			return err
		}
		id += "{" + labels + "}"
	}
	if _, twice := e.values[id]; twice {
		return fmt.Errorf("sample comes twice")
	}
	n, err := strconv.ParseFloat(m[3], 64)
	if err != nil || !realNumber.MatchString(m[3]) {
		return fmt.Errorf("no number, or one that is not finite")
	}
	kind := e.kinds[family]
	if (kind == "info" && n != 1) || (kind == "counter" && (n < 0 || math.IsNaN(n))) {
		return fmt.Errorf("no value of a %s", kind)
	}
	e.values[id] = n
	return nil
}

// readLabels reads name="value",... and gives it back with the values as they are meant.
func readLabels(s string) (string, error) {
	var out []string
	seen := map[string]bool{}
	for {
		name, rest, ok := strings.Cut(s, `="`)
		if !ok || !labelName.MatchString(name) || strings.HasPrefix(name, "__") || seen[name] {
			return "", fmt.Errorf("label name in %q", s)
		}
		seen[name] = true
		end := closing(rest)
		if end < 0 {
			return "", fmt.Errorf("label value in %q does not end", s)
		}
		value, err := unescape(rest[:end])
		if err != nil {
			return "", err
		}
		out = append(out, name+"="+strconv.Quote(value))
		if s = rest[end+1:]; s == "" {
			return strings.Join(out, ","), nil
		}
		if s, ok = strings.CutPrefix(s, ","); !ok {
			return "", fmt.Errorf("label followed by %q", s)
		}
	}
}

// closing is where the first unescaped quote is.
func closing(s string) int {
	for i := 0; i < len(s); i++ {
		switch s[i] {
		case '\\':
			i++
		case '"':
			return i
		}
	}
	return -1
}

func unescape(s string) (string, error) {
	var b strings.Builder
	for i := 0; i < len(s); i++ {
		switch c := s[i]; {
		case c == '"':
			return "", fmt.Errorf("unescaped quote in %q", s)
		case c != '\\':
			b.WriteByte(c)
		case i+1 == len(s) || !strings.ContainsRune(`n"\`, rune(s[i+1])):
			return "", fmt.Errorf("escape in %q", s)
		default:
			i++
			b.WriteString(strings.Replace(s[i:i+1], "n", "\n", 1))
		}
	}
	return b.String(), nil
}

// The reader refuses what the format forbids, so a page that it takes has a worth.
func TestReaderOfMetricsIsStrict(t *testing.T) {
	good := "# TYPE a_seconds gauge\n# UNIT a_seconds seconds\n# HELP a_seconds x \\\"y\\\"\na_seconds{k=\"v\\n\"} 1.5\n# TYPE b counter\nb_total 2\n# TYPE c info\nc_info{v=\"1\"} 1\n# EOF\n"
	e, err := readMetrics(good)
	if err != nil || e.values[`a_seconds{k="v\n"}`] != 1.5 || e.values["b_total"] != 2 || e.kinds["c"] != "info" {
		t.Fatalf("a good page: %v, %v", e, err)
	}
	for name, bad := range map[string]string{
		"no end":              "# TYPE a gauge\na 1\n",
		"end not at the end":  "# EOF\n# TYPE a gauge\n",
		"blank line":          "\n# EOF\n",
		"no family":           "a 1\n# EOF\n",
		"other family":        "# TYPE a gauge\nb 1\n# EOF\n",
		"bare counter":        "# TYPE a counter\na 1\n# EOF\n",
		"negative counter":    "# TYPE a counter\na_total -1\n# EOF\n",
		"info of 2":           "# TYPE a info\na_info 2\n# EOF\n",
		"unit not in name":    "# TYPE a gauge\n# UNIT a seconds\na 1\n# EOF\n",
		"family twice":        "# TYPE a gauge\na 1\n# TYPE b gauge\n# TYPE a gauge\n# EOF\n",
		"type twice":          "# TYPE a gauge\n# TYPE a gauge\n# EOF\n",
		"help after samples":  "# TYPE a gauge\na 1\n# HELP a x\n# EOF\n",
		"sample twice":        "# TYPE a gauge\na{k=\"v\"} 1\na{k=\"v\"} 1\n# EOF\n",
		"names clash":         "# TYPE a counter\na_total 1\n# TYPE a_total gauge\na_total 1\n# EOF\n",
		"no number":           "# TYPE a gauge\na one\n# EOF\n",
		"not finite":          "# TYPE a gauge\na NaN\n# EOF\n",
		"two spaces":          "# TYPE a gauge\na  1\n# EOF\n",
		"quote in a value":    "# TYPE a gauge\na{k=\"v\"w\"} 1\n# EOF\n",
		"newline in a value":  "# TYPE a gauge\na{k=\"v\nw\"} 1\n# EOF\n",
		"unknown escape":      "# TYPE a gauge\na{k=\"\\t\"} 1\n# EOF\n",
		"label name":          "# TYPE a gauge\na{k-l=\"v\"} 1\n# EOF\n",
		"label twice":         "# TYPE a gauge\na{k=\"v\",k=\"w\"} 1\n# EOF\n",
		"unknown type":        "# TYPE a meter\n# EOF\n",
		"not UTF-8":           "# TYPE a gauge\na{k=\"\xff\"} 1\n# EOF\n",
		"quote in help":       "# TYPE a gauge\n# HELP a say \"x\"\n# EOF\n",
		"carriage return":     "# TYPE a gauge\r\na 1\r\n# EOF\n",
		"comment":             "# a word\n# EOF\n",
		"label without value": "# TYPE a gauge\na{k} 1\n# EOF\n",
	} {
		if e, err := readMetrics(bad); err == nil {
			t.Errorf("%s: taken as %v", name, e.values)
		}
	}
}
