package stats

import (
	"math"
	"testing"
)

// Densities at points where they are known in closed form: the normal at 0 and 1; Student's t with 3 degrees of freedom,
// 2/(pi sqrt 3 (1 + t^2/3)^2), and with 5, 8/(3 pi sqrt 5 (1 + t^2/5)^3), with t = z sqrt(df/(df-2)) (Johnson, Kotz and Balakrishnan 1995,
// Continuous Univariate Distributions 2, chapter 28).
func TestDensity(t *testing.T) {
	t3 := func(z float64) float64 {
		x := z * math.Sqrt(3)
		return math.Sqrt(3) * 2 / (math.Pi * math.Sqrt(3) * math.Pow(1+x*x/3, 2))
	}
	t5 := func(z float64) float64 {
		x := z * math.Sqrt(5.0/3)
		return math.Sqrt(5.0/3) * 8 / (3 * math.Pi * math.Sqrt(5) * math.Pow(1+x*x/5, 3))
	}
	three, err := ScaledT(3)
	if err != nil {
		t.Fatal(err)
	}
	five, err := ScaledT(5)
	if err != nil {
		t.Fatal(err)
	}
	for _, z := range []float64{0, 0.3, -1, 2.5, -7, 40, 1e6} {
		for _, c := range []struct {
			name      string
			got, want float64
		}{
			{"t3", three.Density(z), t3(z)},
			{"t5", five.Density(z), t5(z)},
			{"normal", Normal().Density(z), math.Exp(-z*z/2) * 0.3989422804014327},
		} {
			if math.Abs(c.got-c.want) > 1e-12*c.want {
				t.Errorf("%s at %v: %v, want %v", c.name, z, c.got, c.want)
			}
		}
	}
	for _, z := range []float64{math.Inf(1), math.NaN(), math.Inf(-1)} {
		if d := five.Density(z); math.IsNaN(d) || d < 0 {
			t.Errorf("density at %v is %v", z, d)
		}
	}
}

// A density is the slope of the distribution: over a small step the upper tail falls by density times step (Simpson's rule, error of the
// order of step^5).
func TestDensityIsTheSlopeOfTheTail(t *testing.T) {
	tails := []Tail{Normal()}
	for _, df := range []float64{2.5, 3, 4, 5, 8, 30} {
		tail, err := ScaledT(df)
		if err != nil {
			t.Fatal(err)
		}
		tails = append(tails, tail)
	}
	for _, tail := range tails {
		for z := -6.0; z < 6; z += 0.37 {
			const step = 0.01
			a, _ := tail.Upper(z)
			b, _ := tail.Upper(z + step)
			simpson := step / 6 * (tail.Density(z) + 4*tail.Density(z+step/2) + tail.Density(z+step))
			if math.Abs(a-b-simpson) > 1e-11 {
				t.Errorf("df %v at %v: tails differ by %v, density gives %v", tail.df, z, a-b, simpson)
			}
		}
	}
}
