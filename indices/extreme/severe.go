package extreme

import (
	"cmp"
	"fmt"
	"slices"

	"thawledger/indices/compensated"
	"thawledger/pipeline"
)

// Season is a season of the record by one definition.
type Season struct {
	Start     pipeline.Day // key
	Label     string       // 2031 or 2031-32
	Low, High float64      // lowest and highest possible index, degC.d; equal where no missing day leaves it open
	Over      bool
}

// Known says that the season's index is known: over, and one number.
func (s Season) Known() bool { return s.Over && s.Low == s.High }

// Severe is the mean of the most severe seasons of the latest ones.
type Severe struct {
	// Low and High are the lowest and the highest value that it may have, degC.d.
	// They are equal unless a season with missing days may be among the most severe.
	Low, High float64

	Seasons []Season // that were looked at, in order of time
	Used    []Season // the most severe of them, most severe first, by their lower (Lower: higher) bound
	LeftOut []Season // not known, and whatever they were, not among the most severe
	Open    []Season // not known, and they may be (or are) among them: they leave the value open
	Unended int      // seasons that are not over, which never count
}

// Settled says that the value is one number.
func (s *Severe) Settled() bool { return s.Low == s.High }

// MostSevere returns the mean of the count most severe of the latest seasons: the
// warmest summers or severest winters (Upper), or for what must freeze enough the
// mildest winters (Lower). The rules in use are the mean of 3 of the latest 30, and
// where 30 years are not to be had the one of the latest 10 (US Army TM 5-852-1 and
// UFC 3-130-01; R. O. van Everdingen's glossary of permafrost terms, "design
// freezing index", "design thawing index").
//
// seasons holds every season of the record, those without a single day too, in any
// order. A season that is not over does not count. One that is over with days
// missing counts by what it may have been: it is left out only if it could not be
// among the most severe whatever the missing days were; else the value is open
// between Low and High, since a part of a season may already be among them.
//
// It refuses fewer seasons that are over than latest. It panics unless
// 1 <= count <= latest, and if a bound is not finite or Low is above High.
func MostSevere(seasons []Season, tail Tail, count, latest int) (Severe, error) {
	if count < 1 || count > latest {
		panic(fmt.Sprintf("extreme: no mean of %d of %d seasons", count, latest))
	}
	var s Severe
	for _, x := range seasons {
		if finite([]float64{x.Low, x.High}) != nil || x.Low > x.High {
			panic(fmt.Sprintf("extreme: season %s from %v to %v", x.Label, x.Low, x.High))
		}
		if x.Over {
			s.Seasons = append(s.Seasons, x)
		} else {
			s.Unended++
		}
	}
	if len(s.Seasons) < latest {
		return Severe{}, fmt.Errorf("the record has %d seasons that are over; %d are needed", len(s.Seasons), latest)
	}
	slices.SortFunc(s.Seasons, func(a, b Season) int { return cmp.Compare(a.Start, b.Start) })
	s.Seasons = s.Seasons[len(s.Seasons)-latest:]
	// The mean of the count largest rises with every season's index, so that the
	// bounds of it are those of all low and of all high bounds.
	s.Used = ranked(s.Seasons, tail)[:count]
	s.Low = meanOf(s.Seasons, func(x Season) float64 { return x.Low }, tail, count)
	s.High = meanOf(s.Seasons, func(x Season) float64 { return x.High }, tail, count)
	s.judgeUnknown(tail, count)
	return s, nil
}

// judgeUnknown tells the seasons that are not known apart. The least severe that
// the mean may rest on is the count-th of the bounds towards the mild side; a
// season that cannot pass that cannot move the mean.
func (s *Severe) judgeUnknown(tail Tail, count int) {
	last := s.Used[count-1]
	for _, x := range s.Seasons {
		switch {
		case x.Known():
		case tail == Upper && x.High <= last.Low, tail == Lower && x.Low >= last.High:
			s.LeftOut = append(s.LeftOut, x)
		default:
			s.Open = append(s.Open, x)
		}
	}
}

// ranked returns seasons by their bound towards the mild side, most severe first;
// of equals the earlier first.
func ranked(seasons []Season, tail Tail) []Season {
	return slices.SortedStableFunc(slices.Values(seasons), func(a, b Season) int {
		if tail == Lower {
			return cmp.Compare(a.High, b.High)
		}
		return cmp.Compare(b.Low, a.Low)
	})
}

// meanOf returns the mean of the count most severe of one bound of the seasons.
func meanOf(seasons []Season, of func(Season) float64, tail Tail, count int) float64 {
	v := make([]float64, len(seasons))
	for i, x := range seasons {
		v[i] = of(x)
	}
	slices.Sort(v)
	if tail == Upper {
		slices.Reverse(v)
	}
	var sum compensated.Sum
	for _, x := range v[:count] {
		sum.Add(x)
	}
	return sum.Value() / float64(count)
}
