package rules

import (
	"math"
	"testing"
)

func TestOdds(t *testing.T) {
	for log, want := range map[float64]string{
		0: "1 to 1", math.Log(18): "18 to 1", -math.Log(3): "1 to 3", math.Log(1000): "1,000 to 1", 50: "over 1,000 to 1", -50: "1 to over 1,000",
		math.Inf(1): "over 1,000 to 1",
	} {
		if got := Odds(log); got != want {
			t.Errorf("Odds(%v) is %q, want %q", log, got, want)
		}
	}
}
