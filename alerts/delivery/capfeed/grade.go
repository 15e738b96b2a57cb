package capfeed

import (
	"fmt"
	"slices"
	"strings"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
)

// Grade is how a message grades what it tells, in CAP 1.2's words (section
// 3.2.2 of the standard).
type Grade struct {
	Urgency   string
	Severity  string
	Certainty string
	Responses []string // responseType
}

// The values that the standard allows.
var (
	urgencies   = []string{"Immediate", "Expected", "Future", "Past", "Unknown"}
	severities  = []string{"Extreme", "Severe", "Moderate", "Minor", "Unknown"}
	certainties = []string{"Observed", "Likely", "Possible", "Unlikely", "Unknown"}
	responses   = []string{"Shelter", "Evacuate", "Prepare", "Execute", "Avoid", "Monitor", "Assess", "AllClear", "None"}
	categories  = []string{"Geo", "Met", "Safety", "Security", "Rescue", "Fire", "Health", "Env", "Transport", "Infra", "CBRNE", "Other"}
)

// gradeOf maps an item to the standard's words:
//
//	state                          urgency  severity  certainty  response
//	exceeded, confirmed            Future   Moderate  Observed   Assess, Execute
//	exceeded, not confirmed        Future   Moderate  Likely     Assess, Execute
//	fell_short                     Future   Moderate  Observed   Assess, Execute
//	expected, probability over 0.5 Future   Moderate  Likely     Prepare, Monitor
//	expected, else                 Future   Moderate  Possible   Prepare, Monitor
//	near                           Future   Minor     Possible   Monitor
//	unknown                        Unknown  Unknown   Unknown    Monitor, Assess
//	within                         Past     Minor     Observed   AllClear
//	any, withdrawn, now within     Past     Minor     Unlikely   AllClear
//	any, withdrawn, else           Past     Minor     Unlikely   Monitor
//
// Execute is left out where the site has no instruction to carry out; a drill is
// graded as what it shows. The reasons:
//
//   - Urgency: Immediate means at once and Expected within the next hour. Ground
//     thaws over days, so nothing here is either; Future is "in the near future".
//   - Severity: Moderate is a possible threat to life or property, which is what
//     a design value that is passed amounts to; Minor is minimal to no known
//     threat. Severe and Extreme are not for a screening figure to say.
//   - Certainty: Likely is a probability above about one half, Possible up to it.
//
// Settings can put another grade in place of a state's.
func gradeOf(i *delivery.Item, own map[pipeline.State]Grade) Grade {
	if i.Kind == delivery.Withdrawal {
		g := Grade{"Past", "Minor", "Unlikely", []string{"AllClear"}}
		if i.To != pipeline.Within {
			g.Responses = []string{"Monitor"}
		}
		return g
	}
	if g, set := own[i.To]; set {
		return g
	}
	var g Grade
	switch i.To {
	case pipeline.Exceeded:
		g = Grade{"Future", "Moderate", "Likely", []string{"Assess", "Execute"}}
		if i.Confirmed {
			g.Certainty = "Observed"
		}
	case pipeline.FellShort:
		g = Grade{"Future", "Moderate", "Observed", []string{"Assess", "Execute"}}
	case pipeline.Expected:
		g = Grade{"Future", "Moderate", "Possible", []string{"Prepare", "Monitor"}}
		if i.Outlook != nil && i.Outlook.Probability > 0.5 {
			g.Certainty = "Likely"
		}
	case pipeline.Near:
		g = Grade{"Future", "Minor", "Possible", []string{"Monitor"}}
	case pipeline.Within:
		g = Grade{"Past", "Minor", "Observed", []string{"AllClear"}}
	default:
		g = Grade{"Unknown", "Unknown", "Unknown", []string{"Monitor", "Assess"}}
	}
	if strings.TrimSpace(i.Instruction) == "" {
		g.Responses = slices.DeleteFunc(g.Responses, func(r string) bool { return r == "Execute" })
	}
	return g
}

func (g *Grade) check() error {
	for _, part := range []struct {
		name, value string
		allowed     []string
	}{{"urgency", g.Urgency, urgencies}, {"severity", g.Severity, severities}, {"certainty", g.Certainty, certainties}} {
		if !slices.Contains(part.allowed, part.value) {
			return fmt.Errorf("%s %q is none of %s", part.name, part.value, strings.Join(part.allowed, ", "))
		}
	}
	for _, r := range g.Responses {
		if !slices.Contains(responses, r) {
			return fmt.Errorf("response %q is none of %s", r, strings.Join(responses, ", "))
		}
	}
	return nil
}
