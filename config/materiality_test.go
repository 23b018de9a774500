package config

import (
	"strings"
	"testing"
)

// The figure is a share of the NAV in any of the forms of a share; what cannot be one is refused.
func TestMateriality(t *testing.T) {
	for text, want := range map[string]float64{"50bp": 0.005, "0.5%": 0.005, "0.005": 0.005, "1bp": 0.0001, "100%": 1} {
		c, err := Parse("strayd.yaml", []byte(strings.Replace(setText, "equity,", "equity, materiality: "+text+",", 1)), testOptions)
		if err != nil || c.Groups[0].Materiality != want {
			t.Errorf("%s: %v, %v", text, c, err)
		}
	}
	for _, text := range []string{"0", "-1%", "2", "0.5bp", "much", "101%"} {
		_, err := Parse("strayd.yaml", []byte(strings.Replace(setText, "equity,", "equity, materiality: "+text+",", 1)), testOptions)
		if err == nil || !strings.Contains(err.Error(), "groups[0].materiality") {
			t.Errorf("%s: %v", text, err)
		}
	}
}
