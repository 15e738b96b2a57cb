package extreme

import (
	"fmt"
	"math"
)

// Period is a return period as a record of so many seasons may state it.
type Period struct {
	Years   float64 // reciprocal of the chance; 0 if Beyond
	Seasons int     // of the record
	Beyond  bool    // longer than twice the record: all that can be said is "> 2 Seasons years"
}

// PeriodOf states the return period that belongs to a chance by a record of n
// seasons. Beyond twice the record's length it says only that (common practice,
// no source). It panics if chance is not within 0 and 1 or n < 1.
func PeriodOf(chance float64, n int) Period {
	if !(chance >= 0 && chance <= 1) || n < 1 {
		panic(fmt.Sprintf("extreme: no return period of chance %v by %d seasons", chance, n))
	}
	if chance*2*float64(n) < 1 {
		return Period{Seasons: n, Beyond: true}
	}
	return Period{Years: 1 / chance, Seasons: n}
}

// String returns the period with its unit: "23 years", "3.4 years", "> 60 years".
func (p Period) String() string {
	switch {
	case p.Beyond:
		return fmt.Sprintf("> %d years", 2*p.Seasons)
	case p.Years < 9.95:
		return fmt.Sprintf("%.1f years", p.Years)
	}
	return fmt.Sprintf("%.0f years", p.Years)
}

// ChanceInLife returns the chance that in years seasons at least one passes what
// each passes with the given chance, independently of the others: 1 - (1-p)^m. It
// panics if chance is not within 0 and 1 or years is negative.
func ChanceInLife(chance float64, years int) float64 {
	if !(chance >= 0 && chance <= 1) || years < 0 {
		panic(fmt.Sprintf("extreme: no chance in %d years of chance %v", years, chance))
	}
	if chance == 1 {
		if years == 0 {
			return 0
		}
		return 1
	}
	return -math.Expm1(float64(years) * math.Log1p(-chance))
}
