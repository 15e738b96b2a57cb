package pipeline

// EditKind is what an edit does.
type EditKind string

// The kinds of edits.
const (
	EditExclude EditKind = "exclude" // readings are not used
	EditReplace EditKind = "replace" // a day's maximum, minimum or mean is another
	EditOffset  EditKind = "offset"  // degC are added to values
	EditShift   EditKind = "shift"   // seconds are added to times
)

// EditKinds lists the kinds in the order in which messages name them.
var EditKinds = []EditKind{EditExclude, EditReplace, EditOffset, EditShift}
