package filling

import (
	"math"
	"testing"
)

// integral is by Simpson's rule over 10 standard deviations to either side.
func integral(mu, s float64, f func(x float64) float64) float64 {
	const n = 20000
	lo, hi := mu-10*s, mu+10*s
	if lo < 0 && hi > 0 {
		lo = 0 // the kink at 0 must be a node; below it max(0, x) is 0
	}
	if hi <= lo {
		return 0
	}
	h := (hi - lo) / n
	sum := 0.0
	for i := range n + 1 {
		weight := 2.0 + 2*float64(i%2)
		if i == 0 || i == n {
			weight = 1
		}
		x := lo + h*float64(i)
		sum += weight * f(x) * math.Exp(-(x-mu)*(x-mu)/(2*s*s)) / (s * math.Sqrt(2*math.Pi))
	}
	return sum * h / 3
}

// The closed form against numeric integration; the values at mu 0, s 1 are
// 1/sqrt(2 pi) and sqrt(1/2 - 1/(2 pi)).
func TestPositiveAgainstIntegration(t *testing.T) {
	mean, sd := Positive(0, 1)
	near(t, "mean at 0", mean, 0.3989422804014327, 1e-15)
	near(t, "sd at 0", sd, math.Sqrt(0.5-1/(2*math.Pi)), 1e-15)
	for _, mu := range []float64{-12, -3, -0.4, 0, 0.7, 2.5, 15} {
		for _, s := range []float64{0.3, 1, 4.5} {
			positive := func(x float64) float64 { return max(0, x) }
			wantMean := integral(mu, s, positive)
			wantSD := math.Sqrt(max(0, integral(mu, s, func(x float64) float64 { return square(positive(x)) })-wantMean*wantMean))
			mean, sd := Positive(mu, s)
			near(t, "mean", mean, wantMean, 1e-9)
			near(t, "sd", sd, wantSD, 1e-6)
		}
	}
	if mean, sd := Positive(-2, 0); mean != 0 || sd != 0 {
		t.Errorf("without an error: %v, %v", mean, sd)
	}
	if mean, sd := Positive(-1000, 0.5); mean != 0 || sd != 0 {
		t.Errorf("far below zero: %v, %v", mean, sd)
	}
}

// The covariance of two positive parts against integration over both: x, and y
// given x, whose positive part has a closed form.
func TestPositiveCovarianceAgainstIntegration(t *testing.T) {
	for _, c := range []struct{ muX, sX, muY, sY float64 }{{0, 1, 0, 1}, {1, 2, -1, 3}, {4, 3, 2, 3}, {-3, 4, -2, 4}} {
		mX, sdX := Positive(c.muX, c.sX)
		mY, sdY := Positive(c.muY, c.sY)
		for _, rho := range []float64{0, 0.2, 0.5, 0.8, 0.95} {
			want := integral(c.muX, c.sX, func(x float64) float64 {
				m, _ := Positive(c.muY+rho*c.sY*(x-c.muX)/c.sX, c.sY*math.Sqrt(1-rho*rho))
				return max(0, x) * m
			}) - mX*mY
			got := positiveCovariance(c.muX, c.sX, sdX, c.muY, c.sY, sdY, rho)
			near(t, "covariance", got, want, 0.02*sdX*sdY)
		}
		near(t, "with itself", positiveCovariance(c.muX, c.sX, sdX, c.muX, c.sX, sdX, 1), sdX*sdX, 1e-12)
	}
}

func near(t *testing.T, what string, got, want, within float64) {
	t.Helper()
	if !(math.Abs(got-want) <= within) {
		t.Errorf("%s: %.9f; want %.9f within %g", what, got, want, within)
	}
}
