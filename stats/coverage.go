package stats

import (
	"fmt"
	"math"
)

// Test is a likelihood ratio and the probability of one at least as large when the promise holds.
type Test struct{ LR, P float64 }

// Kupiec tests whether hits among n observations agree with a promised share p (proportion of failures). Kupiec 1995, Journal of
// Derivatives 3:73-84; chi-squared with 1 degree of freedom:
//
//	LR = -2 ln[(1-p)^(n-x) p^x / ((1-x/n)^(n-x) (x/n)^x)],  0 ln 0 = 0
//
// It is an error when p is not between 0 and 1, n is below 1 or hits is not from 0 to n.
func Kupiec(hits, n int, p float64) (Test, error) {
	if err := checkTrials(hits, n, p); err != nil {
		return Test{}, err
	}
	x, size := float64(hits), float64(n)
	return test(2*(deviance(x, size*p)+deviance(size-x, size*(1-p))), 1), nil
}

func checkTrials(hits, n int, p float64) error {
	if !(p > 0 && p < 1) || n < 1 || hits < 0 || hits > n {
		return fmt.Errorf("%d hits among %d at a share of %v: need 0 to n hits, n at least 1, a share between 0 and 1", hits, n, p)
	}
	return nil
}

func test(lr float64, df int) Test {
	lr = max(lr, 0)
	p, _ := ChiSquared(lr, df)
	return Test{lr, p}
}

// ChiSquared is the upper tail of a chi-squared variable with 1 or 2 degrees of freedom (any other df counts as 2), and its
// decimal logarithm, at x >= 0. Abramowitz and Stegun 26.4.4 and 26.4.5: the two-sided normal tail of sqrt(x), and exp(-x/2).
func ChiSquared(x float64, df int) (p, log10 float64) {
	x = min(max(x, 0), math.MaxFloat64)
	if df == 1 {
		return Normal().TwoSided(math.Sqrt(x))
	}
	if x == 0 {
		return 1, 0
	}
	return tailOf(math.Exp(-x/2), -x/2)
}

// Transitions counts how often a state followed another, first digit the earlier: 1 is a hit.
type Transitions struct{ N00, N01, N10, N11 int }

// TransitionsOf counts the transitions of a run of hits: one fewer than it is long.
func TransitionsOf(hits []bool) (t Transitions) {
	for i := 1; i < len(hits); i++ {
		switch {
		case hits[i-1] && hits[i]:
			t.N11++
		case hits[i-1]:
			t.N10++
		case hits[i]:
			t.N01++
		default:
			t.N00++
		}
	}
	return t
}

// Independence tests whether a hit is as likely after a hit as after none. Christoffersen 1998, International Economic Review
// 39:841-862; chi-squared with 1 degree of freedom, with pi the share of hits and pi0, pi1 that after no hit and after a hit:
//
//	LR = -2 ln[(1-pi)^(n00+n10) pi^(n01+n11) / ((1-pi0)^n00 pi0^n01 (1-pi1)^n10 pi1^n11)]
//
// Without transitions, or without any of one kind, LR is 0: nothing speaks against it.
func (t Transitions) Independence() Test {
	after0, after1 := float64(t.N00+t.N01), float64(t.N10+t.N11)
	all := after0 + after1
	if all == 0 {
		return Test{0, 1}
	}
	hits, misses := float64(t.N01+t.N11), float64(t.N00+t.N10)
	lr := deviance(float64(t.N01), after0*hits/all) + deviance(float64(t.N00), after0*misses/all) +
		deviance(float64(t.N11), after1*hits/all) + deviance(float64(t.N10), after1*misses/all)
	return test(2*lr, 1)
}

// Conditional joins the test of the share with that of independence: the ratios add, chi-squared with 2 degrees of freedom
// (Christoffersen 1998).
func Conditional(share, independence Test) Test { return test(share.LR+independence.LR, 2) }

// Zone is the traffic light of a count of hits.
type Zone string

// The zones.
const (
	Green  Zone = "green"
	Yellow Zone = "yellow"
	Red    Zone = "red"
)

// ZoneOf is the zone of hits among n at a promised share p: yellow from where P(X <= hits) reaches 95 %, red from 99.99 %. Basle
// Committee, Supervisory framework for the use of backtesting, January 1996, table 2, which has n = 250 and p = 1 %. Errors as
// Kupiec.
func ZoneOf(hits, n int, p float64) (Zone, error) {
	atMost, err := BinomialAtMost(hits, n, p)
	switch {
	case err != nil:
		return "", err
	case atMost >= 0.9999:
		return Red, nil
	case atMost >= 0.95:
		return Yellow, nil
	}
	return Green, nil
}
