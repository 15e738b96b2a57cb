package pipeline

// State is what is shown of a standing: the first of these that is true.
type State string

// The states of a standing. Expected is decided by an outlook; FellShort is the
// end of a season that had to reach its design value and did not.
const (
	Exceeded  State = "exceeded"
	Unknown   State = "unknown"
	Expected  State = "expected"
	Near      State = "near"
	Within    State = "within"
	FellShort State = "fell_short"
)

// Level is how far an index has come against its design value.
type Level string

// The levels, from low to high.
const (
	LevelWithin   Level = "within"
	LevelNear     Level = "near"
	LevelExceeded Level = "exceeded"
)

// Caution goes with every report, page and message.
const Caution = "Screening figures: local codes and a licensed engineer decide."
