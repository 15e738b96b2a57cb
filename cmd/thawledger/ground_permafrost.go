package main

import (
	"errors"
	"fmt"
	"text/tabwriter"
	"time"

	"thawledger/indices/ground"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// Measures of equilibrium are made of the means of ten years or more; more than
// thirty are another climate's. Common practice, no source.
const (
	fewestYears = 10
	mostYears   = 30
)

// groundYear is a thaw season and the freeze season after it, both complete.
type groundYear struct{ thaw, freeze *store.GroundSeason }

// years returns the latest complete years, in order of time.
func (g *grounded) years() (out []groundYear) {
	var thaw *store.GroundSeason
	for i := range g.seasons {
		s := &g.seasons[i]
		switch {
		case s.Definition != string(pipeline.Sum) || !s.Complete:
		case s.Kind == string(pipeline.Thaw):
			thaw = s
		case thaw != nil && s.SeasonStart.Sub(thaw.SeasonStart) < 366*24*time.Hour && s.SeasonStart.After(thaw.SeasonStart):
			out = append(out, groundYear{thaw, s})
			thaw = nil
		}
	}
	return out[max(0, len(out)-mostYears):]
}

// showPermafrost prints TTOP and frost numbers.
func (p program) showPermafrost(g *grounded, _ *store.GroundSeason) error {
	years := g.years()
	if len(years) < fewestYears {
		fmt.Fprintf(p.out, "  TTOP and frost number want %d complete years, and there are %d; ", fewestYears, len(years))
		if len(years) == 0 {
			fmt.Fprintln(p.out, "none is shown")
			return nil
		}
		fmt.Fprintln(p.out, "of single years, only as an index, not as a measure of permafrost:")
		w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
		fmt.Fprintln(w, "    YEAR\tTHAW, AIR degC.d\tFREEZE, AIR degC.d\tFROST NUMBER, AIR\tSURFACE")
		for _, y := range years {
			air, err := frostNumber(y.freeze.IndexLowCDays, y.thaw.IndexLowCDays)
			surface, err2 := y.surfaceFrostNumber()
			if err := errors.Join(err, err2); err != nil {
				return err
			}
			fmt.Fprintf(w, "    %s\t%.1f\t%.1f\t%s\t%s\n", y.thaw.Season, y.thaw.IndexLowCDays, y.freeze.IndexLowCDays, air, surface)
		}
		return w.Flush()
	}
	return p.showEquilibrium(g, years)
}

func frostNumber(freeze, thaw float64) (string, error) {
	f, ok, err := ground.FrostNumber(freeze, thaw)
	if err != nil || !ok {
		return "none", err
	}
	return fmt.Sprintf("%.3f", f), nil
}

func (y groundYear) surfaceFrostNumber() (string, error) {
	if y.thaw.NFactor == nil || y.freeze.NFactor == nil {
		return "no n-factor", nil
	}
	return frostNumber(*y.freeze.NFactor*y.freeze.IndexLowCDays, *y.thaw.NFactor*y.thaw.IndexLowCDays)
}

// showEquilibrium prints the measures of ten years and more.
func (p program) showEquilibrium(g *grounded, years []groundYear) error {
	var air, surface struct{ thaw, freeze float64 }
	factors := true
	for _, y := range years {
		air.thaw += y.thaw.IndexLowCDays / float64(len(years))
		air.freeze += y.freeze.IndexLowCDays / float64(len(years))
		if y.thaw.NFactor == nil || y.freeze.NFactor == nil {
			factors = false
			continue
		}
		surface.thaw += *y.thaw.NFactor * y.thaw.IndexLowCDays / float64(len(years))
		surface.freeze += *y.freeze.NFactor * y.freeze.IndexLowCDays / float64(len(years))
	}
	number, err := frostNumber(air.freeze, air.thaw)
	if err != nil {
		return err
	}
	fmt.Fprintf(p.out, "  equilibrium with the means of %d complete years from %s to %s, sum indices: frost number of the air %s\n",
		len(years), years[0].thaw.Season, years[len(years)-1].thaw.Season, number)
	if !factors {
		fmt.Fprintln(p.out, "    no n-factors for thaw and freeze in all of them: no measure of the surface")
		return nil
	}
	if number, err = frostNumber(surface.freeze, surface.thaw); err != nil {
		return err
	}
	magst, err := ground.MAGST(surface.thaw, surface.freeze)
	if err != nil {
		return err
	}
	fmt.Fprintf(p.out, "    surface: frost number %s, mean annual temperature %.2f degC\n", number, magst)
	depth, err := g.profile.ThawDepth(surface.thaw)
	if err == nil && depth <= 0 {
		err = errors.New("the surface does not thaw")
	}
	var thawed, frozen, ttop float64
	var permafrost bool
	if err == nil {
		thawed, frozen, err = g.profile.Conductivities(depth)
	}
	if err == nil {
		ttop, permafrost, err = ground.TTOP(surface.thaw, surface.freeze, thawed, frozen)
	}
	if err != nil {
		fmt.Fprintf(p.out, "    TTOP: %v\n", err)
		return nil
	}
	says := "no permafrost: temperature at the base of winter's frost"
	if permafrost {
		says = "permafrost"
	}
	fmt.Fprintf(p.out, "    TTOP %.2f degC (%s), with conductivities %.2f thawed, %.2f frozen down to %.2f m\n", ttop, says, thawed, frozen, depth)
	return nil
}
