package filling

import "math"

// density and distribution are those of the standard normal distribution.
func density(z float64) float64      { return math.Exp(-z*z/2) / math.Sqrt(2*math.Pi) }
func distribution(z float64) float64 { return math.Erfc(-z/math.Sqrt2) / 2 }

// Positive returns mean and standard deviation of max(0, X) for a normal X with
// mean mu and standard deviation s, not below 0: with Phi and phi those of the
// standard normal distribution at mu/s,
//
//	mean = mu Phi + s phi,  mean square = (mu^2 + s^2) Phi + mu s phi.
//
// It is what a filled day is expected to add to a sum index, which counts warm
// days only: more than max(0, mu), since a day filled at 0 degC may have been
// warm and takes nothing away if it was cold.
func Positive(mu, s float64) (mean, sd float64) {
	if s == 0 {
		return max(0, mu), 0
	}
	z := mu / s
	p, d := distribution(z), density(z)
	mean = max(0, mu*p+s*d)
	return mean, standard((mu*mu+s*s)*p + mu*s*d - mean*mean)
}

// positiveCovariance is that of max(0, X) and max(0, Y), with sd as Positive
// returns them, for a correlation rho of X and Y. It is a power series in rho
// whose n-th term has the product of the n-th derivatives of the two means by
// their mu, over n! (R. Price, 1958, "A useful theorem for nonlinear devices having
// Gaussian inputs", IRE Transactions on Information Theory 4; from memory): with
// z = mu/s they are s Phi, phi (over s), -z phi (over s^2). What the further terms
// must come to for a day with itself (rho 1) goes with rho^4.
func positiveCovariance(muX, sX, sdX, muY, sY, sdY, rho float64) float64 {
	if sX == 0 || sY == 0 {
		return 0
	}
	a1, a2, a3, aRest := derivatives(muX/sX, sdX/sX)
	b1, b2, b3, bRest := derivatives(muY/sY, sdY/sY)
	return sX * sY * rho * (a1*b1 + rho*(a2*b2+rho*(a3*b3+rho*aRest*bRest)))
}

// derivatives returns the factors of the series for s 1, and the root of the rest
// of the variance.
func derivatives(z, sd float64) (d1, d2, d3, rest float64) {
	d := density(z)
	d1, d2, d3 = distribution(z), d/math.Sqrt2, -z*d/math.Sqrt(6)
	return d1, d2, d3, standard(sd*sd - d1*d1 - d2*d2 - d3*d3)
}
