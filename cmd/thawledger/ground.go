package main

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"text/tabwriter"
	"time"

	"thawledger/indices/ground"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

const groundSynopsis = "ground [--site S] [--surface F]: thaw depth, freeze-back and permafrost measures of surfaces whose ground the settings state"

// ground is the command `ground`.
func (p program) ground(ctx context.Context, args []string) error {
	f := p.flags("ground", groundSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	site := f.String("site", "", "only this `site`")
	surface := f.String("surface", "", "only surfaces of this `name`")
	if _, err := parse(f, args, 0); err != nil {
		return err
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	var asked []grounded
	for i := range set.Sites {
		for j := range set.Sites[i].Surfaces {
			g := grounded{site: &set.Sites[i], surface: &set.Sites[i].Surfaces[j]}
			if (*site == "" || g.site.ID == *site) && (*surface == "" || g.surface.ID == *surface) && len(g.surface.Ground) > 0 {
				asked = append(asked, g)
			}
		}
	}
	if len(asked) == 0 {
		return errors.New("no such surface has its ground in the settings; see `ground` in README.md")
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	records := map[string]*record{} // by station
	for _, g := range asked {
		if err := g.read(ctx, db, records); err != nil {
			return err
		}
		if err := p.showGround(&g); err != nil {
			return fmt.Errorf("ground of %s/%s: %w", g.site.ID, g.surface.ID, err)
		}
	}
	fmt.Fprintln(p.out, `
depths: from the surface down, by heat that is conducted and nothing else. low, high: what missing days and the n-factor's range leave
open; it is not the error of the formulas (10 to 30 %) or of the ground's properties. A season's n-factor on a part of it is an approximation. Nothing of this is stored.`)
	fmt.Fprintln(p.out, pipeline.Caution)
	return nil
}

// grounded is a surface with its ground and what the database knows of it.
type grounded struct {
	site    *pipeline.Site
	surface *pipeline.Surface
	profile ground.Profile
	seasons []store.GroundSeason
	record  *record
}

func (g *grounded) read(ctx context.Context, db *store.DB, records map[string]*record) (err error) {
	if g.profile, err = ground.Build(g.surface.Ground); err != nil {
		return fmt.Errorf("ground of %s/%s: %w", g.site.ID, g.surface.ID, err)
	}
	if g.seasons, err = db.GroundSeasons(ctx, g.site.ID, g.surface.ID); err != nil {
		return err
	}
	if g.record = records[g.site.Station]; g.record == nil {
		days, err := db.DailyMeans(ctx, g.site.Station)
		if err != nil {
			return err
		}
		g.record = newRecord(days)
		records[g.site.Station] = g.record
	}
	return nil
}

// latest returns the last season of a kind and definition that ok holds for.
func (g *grounded) latest(kind pipeline.Kind, definition pipeline.Definition, ok func(*store.GroundSeason) bool) *store.GroundSeason {
	for i := len(g.seasons) - 1; i >= 0; i-- {
		s := &g.seasons[i]
		if s.Kind == string(kind) && s.Definition == string(definition) && ok(s) {
			return s
		}
	}
	return nil
}

func anySeason(*store.GroundSeason) bool { return true }

func (p program) showGround(g *grounded) error {
	fmt.Fprintf(p.out, "\n%s / %s: %s, on station %s\n", g.site.ID, g.surface.ID, g.surface.Name, g.site.Station)
	p.showLayers(g)
	for _, s := range g.seasons {
		if s.BaseC != 0 {
			fmt.Fprintf(p.out, "  the station's indices have a base of %g degC: depths need 0 degC\n", s.BaseC)
			return nil
		}
	}
	thaw := g.latest(pipeline.Thaw, pipeline.Curve, anySeason)
	if thaw == nil {
		fmt.Fprintln(p.out, "  the station has no thaw season yet")
		return nil
	}
	for _, show := range []func(*grounded, *store.GroundSeason) error{p.showThaw, p.showHeat, p.showFreezeBack, p.showPermafrost} {
		if err := show(g, thaw); err != nil {
			return err
		}
	}
	return nil
}

// showLayers prints the profile as built.
func (p program) showLayers(g *grounded) {
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	fmt.Fprintln(w, "  LAYER m\tMADE BY\tk THAWED, FROZEN W/(m K)\tC THAWED, FROZEN MJ/(m3 K)\tLATENT MJ/m3\tSOURCE")
	top := 0.0
	for i, l := range g.profile {
		to := "down"
		if l.ThicknessM > 0 {
			to = fmt.Sprintf("to %.2f", top+l.ThicknessM)
		}
		stated := g.surface.Ground[i]
		by := "stated"
		if s := stated.Soil; s != nil {
			by = fmt.Sprintf("%s: %s, %g kg/m3, %g %% of dry mass", s.Method, s.Texture, s.DryDensityKgM3, s.WaterPctDry)
			if s.Method == pipeline.Johansen {
				by += fmt.Sprintf(", quartz %g", s.QuartzShare)
			}
		}
		fmt.Fprintf(w, "  %.2f %s\t%s\t%.2f, %.2f\t%.2f, %.2f\t%.1f\t%s\n", top, to, by, l.KThawedWMK, l.KFrozenWMK,
			l.CThawedJM3K/1e6, l.CFrozenJM3K/1e6, l.LatentJM3/1e6, stated.Source)
		top += l.ThicknessM
	}
	w.Flush()
}

// length is how many days a season has had; 0 if it has not begun.
func length(s *store.GroundSeason) float64 {
	if s.StartDay == nil || s.EndDay == nil {
		return 0
	}
	return s.EndDay.Sub(*s.StartDay).Hours()/24 + 1
}

func seasonName(s *store.GroundSeason) string {
	name := s.Kind + " " + s.Season
	if !s.SeasonOver {
		name += " (open, through " + s.ThroughDay.Format(time.DateOnly) + ")"
	}
	return name
}

// showThaw prints the latest thaw season's index and depths, and design depths.
func (p program) showThaw(g *grounded, s *store.GroundSeason) error {
	if s.NFactor == nil {
		fmt.Fprintf(p.out, "  %s: the surface has no n-factor for thaw, so no depth\n", seasonName(s))
		return nil
	}
	indices, heads := []float64{*s.NFactor * s.IndexLowCDays}, []string{"index"}
	if low, high := *s.NLow*s.IndexLowCDays, *s.NHigh*s.IndexHighCDays; low < high {
		indices, heads = []float64{low, *s.NFactor * (s.IndexLowCDays + s.IndexHighCDays) / 2, high}, []string{"low", "middle", "high"}
	}
	fmt.Fprintf(p.out, "  %s, surface index n %s times curve index of the air, %d days missing\n", seasonName(s), factorText(s), s.DaysMissing)
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	fmt.Fprintln(w, "    \tINDEX degC.d\tSTEFAN m\tMODIFIED BERGGREN m")
	for i, index := range indices {
		stefan, err := g.profile.ThawDepth(index)
		fmt.Fprintf(w, "    %s\t%.1f\t%s\t%s\n", heads[i], index, depthText(stefan, err), g.berggren(index, s))
	}
	w.Flush()
	for i := range g.surface.Designs {
		d := &g.surface.Designs[i]
		if d.DepthM == nil {
			continue
		}
		line := fmt.Sprintf("    design depth %g m: reached by a surface index of %.1f degC.d", *d.DepthM, d.Index)
		if d.Definition == pipeline.Curve || d.Definition == pipeline.NotStated {
			line += fmt.Sprintf(", of which %s gone", bounds(100*indices[0]/d.Index, 100*indices[len(indices)-1]/d.Index, 100, " %"))
		}
		fmt.Fprintln(p.out, line)
	}
	return nil
}

// factorText is the n-factor, with its range where one is stated.
func factorText(s *store.GroundSeason) string {
	text := fmt.Sprintf("%g", *s.NFactor)
	if *s.NLow < *s.NHigh {
		text += fmt.Sprintf(" (%g to %g)", *s.NLow, *s.NHigh)
	}
	return text
}

func depthText(m float64, err error) string {
	if err != nil {
		return err.Error()
	}
	return fmt.Sprintf("%.2f", m)
}

// berggren is the depth by the modified Berggren formula, and what it rests on.
func (g *grounded) berggren(index float64, s *store.GroundSeason) string {
	days := length(s)
	switch {
	case !g.record.hasMean:
		return "not every date of the year has a daily mean: no mean annual temperature"
	case days < 1:
		return "the season has not begun"
	}
	b, err := g.profile.Berggren(ground.Season{Kind: pipeline.Thaw, SurfaceCDays: index, LengthDays: days, MeanAnnualC: g.record.meanC})
	if err != nil {
		return err.Error()
	}
	return fmt.Sprintf("%.2f (mean of the year %.1f degC, season %.0f days, alpha %.2f, lambda %.2f)", b.DepthM, g.record.meanC, days, b.Alpha, b.Lambda)
}

// showFreezeBack prints how far the latest winter has come against what the summer
// before it had thawed.
func (p program) showFreezeBack(g *grounded, _ *store.GroundSeason) error {
	winter := g.latest(pipeline.Freeze, pipeline.Curve, anySeason)
	if winter == nil {
		return nil
	}
	summer := g.latest(pipeline.Thaw, pipeline.Curve, func(s *store.GroundSeason) bool { return s.SeasonStart.Before(winter.SeasonStart) })
	if summer == nil || summer.NFactor == nil || winter.NFactor == nil {
		fmt.Fprintf(p.out, "  freeze-back, %s: it wants n-factors for thaw and freeze, and the summer before\n", seasonName(winter))
		return nil
	}
	at := func(thawIndex, freezeIndex float64) (ground.FreezeBack, error) {
		depth, err := g.profile.ThawDepth(thawIndex)
		if err != nil {
			return ground.FreezeBack{}, err
		}
		return g.profile.FreezeBack(depth, freezeIndex)
	}
	low, err := at(*summer.NHigh*summer.IndexHighCDays, *winter.NLow*winter.IndexLowCDays)
	high, err2 := at(*summer.NLow*summer.IndexLowCDays, *winter.NHigh*winter.IndexHighCDays)
	if err := errors.Join(err, err2); err != nil {
		fmt.Fprintf(p.out, "  freeze-back, %s: %s\n", seasonName(winter), strings.ReplaceAll(err.Error(), "\n", "; "))
		return nil
	}
	fmt.Fprintf(p.out, "  freeze-back, %s: %s of what freezes %s again\n    needed %s; surface freezing index so far %s; thaw %s had reached %s\n",
		seasonName(winter), bounds(100*low.Share, 100*high.Share, 100, " %"), "thaw "+summer.Season,
		openRange(high.NeededCDays, low.NeededCDays, "%.1f", " degC.d"), openRange(low.GoneCDays, high.GoneCDays, "%.1f", " degC.d"), summer.Season, openRange(high.ThawDepthM, low.ThawDepthM, "%.2f", " m"))
	fmt.Fprintln(p.out, "    frost from above only: over cold permafrost it comes from below as well, and less will do")
	return nil
}

// openRange shows a value, or its range where it is open.
func openRange(low, high float64, format, unit string) string {
	if low == high {
		return fmt.Sprintf(format, low) + unit
	}
	return fmt.Sprintf(format+" to "+format, low, high) + unit
}
