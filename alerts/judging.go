package alerts

import (
	"context"
	"fmt"
	"time"

	"thawledger/alerts/judge"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// judgeStation judges all surfaces on a station, in every season that a change
// may have touched, in one transaction.
func (s *Service) judgeStation(ctx context.Context, station string) error {
	err := s.DB.JudgeStation(ctx, station, func(j *store.Judging, from pipeline.Day) error {
		retired, err := j.ClearRetired(ctx)
		if err != nil {
			return err
		}
		designs, err := j.Designs(ctx)
		if err != nil {
			return err
		}
		for _, kind := range []pipeline.Kind{pipeline.Thaw, pipeline.Freeze} {
			if err := s.judgeKind(ctx, j, designs, retired, kind, from); err != nil {
				return err
			}
		}
		return nil
	})
	if err != nil {
		return fmt.Errorf("judge surfaces on station %s: %w", station, err)
	}
	return nil
}

func (s *Service) judgeKind(ctx context.Context, j *store.Judging, designs []store.Design, retired map[store.Retired]pipeline.State, kind pipeline.Kind, from pipeline.Day) error {
	seasons, err := j.Seasons(ctx, kind, from)
	if err != nil {
		return err
	}
	first := from
	if len(seasons) > 0 {
		first = min(from, seasons[0].Start)
	}
	days, err := j.IndexDays(ctx, kind, first)
	if err != nil {
		return err
	}
	bySeason := map[pipeline.Day][]store.IndexDay{}
	for start := 0; start < len(days); {
		end := start + 1
		for end < len(days) && days[end].Season == days[start].Season {
			end++
		}
		bySeason[days[start].Season] = days[start:end]
		start = end
	}
	for i := range designs {
		d := &designs[i]
		if d.Kind != kind {
			continue
		}
		var judged []pipeline.Day
		for _, season := range seasons {
			n, ok := applies(d, designs, season.Start)
			if !ok || len(bySeason[season.Start]) == 0 {
				continue
			}
			if err := s.judgeSeason(ctx, j, d, n, retired, season, bySeason[season.Start]); err != nil {
				return err
			}
			judged = append(judged, season.Start)
		}
		if err := j.DropStandings(ctx, d.ID, first, judged); err != nil {
			return err
		}
	}
	return nil
}

// applies says whether a design value is the one in force for a season, and
// returns the n-factor to apply; nil for a design value of the air.
func applies(d *store.Design, all []store.Design, season pipeline.Day) (n *float64, ok bool) {
	if d.From > season {
		return nil, false
	}
	for i := range all {
		o := &all[i]
		if o.Site == d.Site && o.Surface == d.Surface && o.Kind == d.Kind && o.Definition == d.Definition &&
			o.Of == d.Of && o.Direction == d.Direction && o.From > d.From && o.From <= season {
			return nil, false
		}
	}
	if d.Of == pipeline.OfAir {
		return nil, true
	}
	for i := range d.Factors {
		if d.Factors[i].From <= season {
			n = &d.Factors[i].Value
		}
	}
	return n, n != nil
}

// judgeSeason judges one surface in one season and keeps what came of it.
func (s *Service) judgeSeason(ctx context.Context, j *store.Judging, d *store.Design, n *float64, retired map[store.Retired]pipeline.State, season store.SeasonState, days []store.IndexDay) error {
	factor := 1.0
	if n != nil {
		factor = *n
	}
	compared := make([]judge.Day, len(days))
	for i, x := range days {
		low, high := x.CurveLow, x.CurveHigh
		if d.Definition == pipeline.Sum {
			low, high = x.SumLow, x.SumHigh
		}
		compared[i] = judge.Day{Day: x.Day, Low: factor * low, High: factor * high}
	}
	before, err := j.Standing(ctx, d.ID, season.Start)
	if err != nil {
		return err
	}
	var made *store.OutlookRow
	if !season.Over {
		if made, err = j.Outlook(ctx, d.ID, season.Start); err != nil {
			return err
		}
	}
	var outlook *judge.Outlook
	if made != nil {
		low, high := made.Adverse(d.Direction)
		outlook = &judge.Outlook{Low: low, High: high, Skilful: made.AnnouncedAllowed}
	}
	v := judge.Season(judge.Design{CDays: d.CDays, NearShare: d.NearShare, Direction: d.Direction}, compared, season.Over,
		outlook, before != nil && before.Expected)
	row := &store.StandingRow{
		Design: d, Season: season.Start, Label: season.Label, Day: season.Through, State: v.State, Level: v.Level,
		Straddles: v.Straddles, Low: v.Low, High: v.High, Factor: n, NearOn: v.NearOn, ExceededOn: v.ExceededOn,
		ConfirmedOn: v.ConfirmedOn, Interpolated: season.Interpolated, Missing: season.Missing, Over: season.Over,
		Outlook: made,
	}
	if d.Definition == pipeline.NotStated {
		sum := factor * days[len(days)-1].SumLow
		row.SumBeside = &sum
	}
	if v.Expected {
		row.ExpectedOn = &made.Through
		if before != nil && before.ExpectedOn != nil {
			row.ExpectedOn = before.ExpectedOn
		}
	}
	exceedance, err := s.keepExceedance(ctx, j, row, before)
	if err != nil {
		return err
	}
	if err := j.WriteStanding(ctx, row); err != nil {
		return err
	}
	change := store.StandingChange{Exceedance: exceedance}
	var past *judge.Past
	if before != nil {
		change.From = before.State
		past = &judge.Past{State: before.State, Level: before.Level, Straddles: before.Straddles, Expected: before.Expected}
	}
	replaced := false
	if before == nil {
		// What was told by a design value that is no longer in force is put right.
		change.From, replaced = retired[store.Retired{Site: d.Site, Surface: d.Surface, Kind: d.Kind, Definition: d.Definition, Of: d.Of,
			Direction: d.Direction, Season: season.Start}]
	}
	if change.From == row.State {
		return nil
	}
	change.Why = judge.Why(past, v, before != nil && season.Through > before.Day)
	if season.Over && change.From == pipeline.Expected {
		change.Why = judge.SeasonOver
	}
	if replaced {
		change.Why = judge.Replaced
	}
	change.Announce = judge.Told(d.Direction, change.From, row.State) && s.open(d, season, past != nil || replaced, change.From == pipeline.Expected)
	if err := j.AddStandingChange(ctx, row, change); err != nil || !change.Announce {
		return err
	}
	return s.tell(ctx, j, row, change)
}

// keepExceedance opens, changes or withdraws the exceedance of a standing and
// returns its number; 0 if there is none.
func (s *Service) keepExceedance(ctx context.Context, j *store.Judging, row *store.StandingRow, before *store.Before) (int64, error) {
	above := row.Level != pipeline.LevelWithin || row.State == pipeline.FellShort || row.ExpectedOn != nil
	var id int64
	if before != nil {
		id = before.Exceedance
	}
	switch {
	case !above && id == 0:
		return 0, nil
	case !above:
		return id, j.WithdrawExceedance(ctx, id, row.Day)
	case id == 0:
		var err error
		if id, err = j.OpenExceedance(ctx, row); err != nil {
			return 0, err
		}
	}
	return id, j.ChangeExceedance(ctx, id, row, row.Day)
}

// open says whether a season's changes are told: it must not be over, neither by
// its record nor by the clock. What a not_below season comes to is only known at
// its end, so that is told for another 45 days, if it was judged while open; and so
// is what became of a season that was expected to end on the wrong side.
func (s *Service) open(d *store.Design, season store.SeasonState, judgedBefore, expected bool) bool {
	lastDay := pipeline.DayOf(yearAfter(season.Start)) - 1
	today := pipeline.Day(s.Now().Unix() / 86400)
	if d.Direction == pipeline.NotBelow || expected {
		return judgedBefore && today <= lastDay+45
	}
	return !season.Over && today <= lastDay
}

func yearAfter(d pipeline.Day) (year int, month time.Month, day int) {
	year, month, day = d.Date()
	return year + 1, month, day
}
