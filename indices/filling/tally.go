package filling

import "math"

// tally gathers the trials of a cell.
type tally struct {
	repeats, untouched, within     int
	errors, squares, ses, variance float64
}

func (t *tally) add(errorC, seC float64) {
	t.repeats++
	if math.Abs(errorC) < touchedCDays && seC < touchedCDays {
		t.untouched++
		return
	}
	if math.Abs(errorC) <= 2*seC {
		t.within++
	}
	t.errors += errorC
	t.squares += errorC * errorC
	t.ses += seC
	t.variance += seC * seC
}

// cell sums up; seasons is how many took turns.
func (t *tally) cell(k cellKey, parts [places]Part, seasons int) Cell {
	c := Cell{Rung: k.rung, Part: k.part, Block: k.block, Definition: k.definition,
		Repeats: t.repeats, Untouched: t.untouched, Within: t.within}
	n := c.Tried()
	if n == 0 {
		return c
	}
	days := 0
	for _, p := range parts {
		if p == k.part {
			days++
		}
	}
	c.Separate = min(n, max(1, days/k.block)*min(seasons, t.repeats))
	c.CoverLow, c.CoverHigh = Wilson(c.Cover(), c.Separate)
	c.BiasC, c.RMSEC = t.errors/float64(n), standard(t.squares/float64(n))
	c.SEC, c.WidthC = standard(t.variance/float64(n)), 4*t.ses/float64(n)
	return c
}

// Wilson returns the 95 % interval of a probability of which n independent
// trials gave a share (E. B. Wilson, 1927, "Probable inference, the law of
// succession, and statistical inference", J. Am. Stat. Assoc. 22). Without a
// trial it is 0 to 1.
func Wilson(share float64, n int) (low, high float64) {
	if n < 1 {
		return 0, 1
	}
	const z = 1.959963984540054 // of the normal distribution at 0.975
	f := float64(n)
	middle := (share + z*z/(2*f)) / (1 + z*z/f)
	half := z / (1 + z*z/f) * standard(share*(1-share)/f+z*z/(4*f*f))
	return max(0, middle-half), min(1, middle+half)
}
