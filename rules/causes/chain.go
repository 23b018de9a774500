package causes

import "strayd/rules"

// Causes that last: what held yesterday carries part of its share into today, so that evidence of a run adds up (the forward recursion of
// Rabiner 1989, Proceedings of the IEEE 77:257-286). Only the newest depth dates of an unbroken run of odd days count.
const depth = 8

// leastCarried is the share from which on tomorrow is weighed whatever it looks like.
const leastCarried = 0.002

const (
	runX100 = iota
	runX10
	runDiv100
	runSign
	runZero
	runRepeat
	runCumulative
	runFXMissing
	runFXTwice
	runSwapped
	runShifted
	runs
)

// stays is the share that a cause carries into the next date.
var stays = [runs]float64{0.5, 0.2, 0.5, 0.3, 0.3, 0.3, 0.8, 0.8, 0.8, 0.95, 0.8}

func persistent(c rules.Cause) int {
	switch c {
	case rules.CauseX100:
		return runX100
	case rules.CauseX10:
		return runX10
	case rules.CauseDiv100:
		return runDiv100
	case rules.CauseSign:
		return runSign
	case rules.CauseZero:
		return runZero
	case rules.CauseRepeat:
		return runRepeat
	case rules.CauseCumulative:
		return runCumulative
	case rules.CauseFXMissing:
		return runFXMissing
	case rules.CauseFXTwice:
		return runFXTwice
	case rules.CauseSwapped:
		return runSwapped
	case rules.CauseShifted:
		return runShifted
	}
	return -1
}

var startPrior = [runs]float64{priorX100, priorX10, priorDiv100, priorSign, priorZero, priorRepeat, priorCumulative, priorFX, priorFX,
	priorSwap, priorShifted}

// chain is the evidence of the days of a run.
type chain struct {
	n       int // days in it
	ratio   [depth][runs]float32
	today   [runs]float32
	carry   [runs]float64 // of each cause, into today
	active  bool          // something is carried
	partner int           // of a swap, at the end of the run
}

// prior is a cause's prior with what yesterday carries.
func (c *chain) prior(k int, prior float64) float64 { return prior + c.carry[k] }

// note keeps how well a cause explains today.
func (c *chain) note(k int, ratio float64) { c.today[k] = float32(min(ratio, 1e9)) }

// broken ends a run: today is plainly ordinary, or missing.
func (c *chain) broken() {
	if c.n > 0 || c.active {
		c.n, c.active, c.carry = 0, false, [runs]float64{}
	}
}

// restart forgets what a cause has gathered.
func (c *chain) restart(k int) {
	for d := range c.n {
		c.ratio[d][k] = 0
	}
	c.carry[k] = 0
}

// next closes today and works out what is carried into tomorrow.
func (c *chain) next() {
	if c.n == depth {
		copy(c.ratio[:], c.ratio[1:])
		c.n--
	}
	c.ratio[c.n] = c.today
	c.n++
	c.today = [runs]float32{}
	var post [runs]float64
	for d := range c.n {
		total := 1.0
		for k := range post {
			post[k] = float64(float64(c.ratio[d][k]) * (startPrior[k] + float64(stays[k]*post[k])))
			total += post[k]
		}
		for k := range post {
			post[k] /= total
		}
	}
	c.active = false
	for k := range post {
		c.carry[k] = stays[k] * post[k]
		c.active = c.active || c.carry[k] > leastCarried
	}
}
