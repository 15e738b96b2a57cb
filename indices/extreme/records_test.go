package extreme

import (
	"math"
	"testing"
)

// crrel is the record of freezing indices, winters 1969-70 to 1989-90, degC.d, of
// CRREL Report 96-14, table 20.
func crrel() []float64 {
	return []float64{
		1191, 1152, 1274, 839, 923, 968, 931, 1256, 1331, 1477, 903, 666, 1227, 589, 1179, 942, 1197, 467,
		898, 1032, 750,
	}
}

// portPirie is the record of annual highest sea levels, 1923 to 1987, m, of Coles
// 2001, p. 4, as R's package evd has it.
func portPirie() []float64 {
	return []float64{
		4.03, 3.83, 3.65, 3.88, 4.01, 4.08, 4.18, 3.80, 4.36, 3.96, 3.98, 4.69, 3.85, 3.96, 3.85, 3.93, 3.75,
		3.63, 3.57, 4.25, 3.97, 4.05, 4.24, 4.22, 3.73, 4.37, 4.06, 3.71, 3.96, 4.06, 4.55, 3.79, 3.89, 4.11,
		3.85, 3.86, 3.86, 4.21, 4.01, 4.11, 4.24, 3.96, 4.21, 3.74, 3.85, 3.88, 3.66, 4.11, 3.71, 4.18, 3.90,
		3.78, 3.91, 3.72, 4.00, 3.66, 3.62, 4.33, 4.55, 3.75, 4.08, 3.90, 3.88, 3.94, 4.33,
	}
}

// near fails unless got is within tolerance of want.
func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: %.10g; want %.10g, within %g", what, got, want, tolerance)
	}
}

func fitted(t *testing.T, name Name, sample []float64) Distribution {
	t.Helper()
	d, err := Fit(name, sample)
	if err != nil {
		t.Fatal(err)
	}
	return d
}
