package extreme

import "math"

// The gamma distribution of shape a, standardised: g = a + z sqrt(a) has mean a
// and standard deviation sqrt(a), so that z has 0 and 1. It begins at z = -sqrt(a).

// uniformFrom is the shape from which the uniform expansion is used: below it the
// series and the continued fraction take at most some hundred terms.
const uniformFrom = 1e4

// gammaSides returns the chances of at or below z and of above z, that is the
// regularised incomplete gamma functions P(a, g) and Q(a, g): by the series for
// g < a+1 and by the continued fraction (A. R. DiDonato and A. H. Morris, 1986,
// ACM TOMS 12, and Numerical Recipes, section "incomplete gamma function", from
// memory), and for large a by N. M. Temme's uniform expansion. Relative accuracy
// of the smaller one better than 1e-10 down to 1e-12, against R's pgamma.
func gammaSides(a, z float64) (lower, upper float64) {
	if a >= uniformFrom {
		return gammaUniform(a, z)
	}
	g := a + float64(z*math.Sqrt(a))
	if g <= 0 {
		return 0, 1
	}
	if g < a+1 {
		lower = gammaSeries(a, g)
		return lower, 1 - lower
	}
	upper = gammaFraction(a, g)
	return 1 - upper, upper
}

// gammaFront returns g^a e^-g / Gamma(a).
func gammaFront(a, g float64) float64 {
	lg, _ := math.Lgamma(a)
	return math.Exp(a*math.Log(g) - g - lg)
}

// gammaSeries returns P(a, g) = g^a e^-g / Gamma(a) sum of g^n / (a (a+1)...(a+n)).
func gammaSeries(a, g float64) float64 {
	term := 1 / a
	sum := term
	for n := 1.0; n < 1e5; n++ {
		term *= g / (a + n)
		sum += term
		if term < sum*1e-17 {
			break
		}
	}
	return min(1, gammaFront(a, g)*sum)
}

// gammaFraction returns Q(a, g) by its continued fraction, evaluated forwards
// (W. J. Lentz's method as modified by Thompson and Barnett).
func gammaFraction(a, g float64) float64 {
	const tiny = 1e-300
	b := g + 1 - a
	c, d := 1/tiny, 1/b
	h := d
	for i := 1.0; i < 1e5; i++ {
		an := -i * (i - a)
		b += 2
		d = an*d + b
		if math.Abs(d) < tiny {
			d = tiny
		}
		c = b + an/c
		if math.Abs(c) < tiny {
			c = tiny
		}
		d = 1 / d
		step := d * c
		h *= step
		if math.Abs(step-1) < 1e-16 {
			break
		}
	}
	return min(1, gammaFront(a, g)*h)
}

// gammaUniform is the expansion for large a that is uniform in g (N. M. Temme,
// 1979, SIAM J. Math. Anal. 10; NIST Digital Library of Mathematical Functions,
// section 8.12; coefficients from memory):
//
//	Q = erfc(eta sqrt(a/2))/2 + R,  P = erfc(-eta sqrt(a/2))/2 - R,
//	R = exp(-a eta^2/2)/sqrt(2 pi a) (c0(eta) + c1(eta)/a + ...),
//	eta^2/2 = mu - ln(1+mu),  mu = (g-a)/a = z/sqrt(a).
//
// c0 and c1 are cut off where, for a >= 1e4 and any z that has a chance above
// 1e-15, the rest is below 1e-12 of the result.
func gammaUniform(a, z float64) (lower, upper float64) {
	mu := z / math.Sqrt(a)
	if mu <= -1 {
		return 0, 1
	}
	half := muLessLog(mu)
	eta := math.Copysign(math.Sqrt(2*half), mu)
	root := eta * math.Sqrt(a/2)
	c0 := -1.0/3 + eta*(1.0/12+eta*(-2.0/135+eta*(1.0/864+eta*(1.0/2835-eta*1.787551440329218e-4))))
	c1 := -1.0/540 + eta*(-1.0/288+eta/378)
	rest := math.Exp(-a*half) / math.Sqrt(2*math.Pi*a) * (c0 + c1/a)
	upper = math.Erfc(root)/2 + rest
	lower = math.Erfc(-root)/2 - rest
	return min(max(lower, 0), 1), min(max(upper, 0), 1)
}

// muLessLog returns mu - ln(1+mu) without the loss of digits near 0.
func muLessLog(mu float64) float64 {
	if math.Abs(mu) > 0.05 {
		return mu - math.Log1p(mu)
	}
	sum, power := 0.0, mu*mu
	for n := 2.0; n < 20; n++ {
		sum += power / n
		power *= -mu
	}
	return sum
}

// gammaQuantile returns the z that has the chance lower at or below it and upper
// = 1 - lower above it. It solves for the smaller of the two, by Newton's steps
// kept within a bracket that closes by halving where they would leave it.
func gammaQuantile(a, lower, upper float64) float64 {
	root := math.Sqrt(a)
	low, high := -root, 40*(1+1/root)
	z := wilsonHilferty(a, normalQuantile(lower))
	if !(z > low && z < high) {
		z = low + (min(high, 1)-low)/2
	}
	for range 200 {
		p, q := gammaSides(a, z)
		miss := p - lower
		if upper < lower {
			miss = upper - q
		}
		if miss == 0 {
			return z
		}
		if miss > 0 {
			high = z
		} else {
			low = z
		}
		next := low + (high-low)/2
		if density := gammaDensity(a, z); density > 0 {
			if newton := z - miss/density; newton > low && newton < high {
				next = newton
			}
		}
		if math.Abs(next-z) <= 4e-16*(1+math.Abs(z)) {
			return next
		}
		z = next
	}
	return z
}

// wilsonHilferty is the cube-root approximation to a quantile (E. B. Wilson and
// M. M. Hilferty, 1931, PNAS 17): where the search starts.
func wilsonHilferty(a, normal float64) float64 {
	c := 1 - 1/(9*a) + normal/(3*math.Sqrt(a))
	return math.Sqrt(a) * (c*c*c - 1)
}

// gammaDensity is the density of z.
func gammaDensity(a, z float64) float64 {
	mu := z / math.Sqrt(a)
	if mu <= -1 {
		return 0
	}
	if a >= uniformFrom { // Stirling's series for Gamma(a), to 1/a
		return math.Exp(-a*muLessLog(mu)-1/(12*a)) / (math.Sqrt(2*math.Pi) * (1 + mu))
	}
	g := a * (1 + mu)
	return gammaFront(a, g) / g * math.Sqrt(a)
}
