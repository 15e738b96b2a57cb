package pipeline

// Kind tells a thawing from a freezing index.
type Kind string

// The two kinds of index.
const (
	Thaw   Kind = "thaw"
	Freeze Kind = "freeze"
)

// Definition is how an index is made from daily means. Indices of different
// definitions are never compared.
type Definition string

// The definitions of an index or a design value. Curve: the rise of the
// cumulative degree-day curve from the spring low to the autumn high (freezing:
// from the autumn high to the next spring low). Sum: positive (negative) daily
// means only. Monthly: from monthly means. NotStated: the document does not say.
const (
	Curve     Definition = "curve"
	Sum       Definition = "sum"
	Monthly   Definition = "monthly"
	NotStated Definition = "not_stated"
)

// Definitions lists the definitions in the order in which messages name them.
var Definitions = []Definition{Curve, Sum, Monthly, NotStated}

// Origin says where a daily mean came from. The numbers are stored.
type Origin uint8

// The origins of a daily mean.
const (
	Missing      Origin = 0 // no mean: bounds only
	Observed     Origin = 1 // made from readings by the station's rule
	Interpolated Origin = 2 // on a straight line between the observed days beside it
	ByNeighbour  Origin = 3 // by regression on another station
	ByClimate    Origin = 4 // the mean of the date
)

// Filled reports whether a mean was estimated, with an error.
func (o Origin) Filled() bool { return o == Interpolated || o == ByNeighbour || o == ByClimate }

// String returns the origin's name.
func (o Origin) String() string {
	switch o {
	case Missing:
		return "missing"
	case Observed:
		return "observed"
	case Interpolated:
		return "interpolated"
	case ByNeighbour:
		return "neighbour"
	case ByClimate:
		return "climatology"
	}
	return "unknown"
}
