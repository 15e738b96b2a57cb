package alerts

import (
	"context"
	"encoding/json"
	"fmt"

	"go.uber.org/zap"

	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// Announcement is what goes on the bus when a standing changes, as JSON.
// Indices are in degC.d; Index is absent where missing days leave it open.
type Announcement struct {
	Version     int            `json:"version"` // 1
	Site        string         `json:"site"`
	Surface     string         `json:"surface"`
	Kind        pipeline.Kind  `json:"kind"`
	SeasonStart string         `json:"season_start"`
	Day         string         `json:"day"`
	From        pipeline.State `json:"from,omitempty"`
	To          pipeline.State `json:"to"`
	Why         string         `json:"why"`
	IndexCDays  *float64       `json:"index_c_days,omitempty"`
	LowCDays    float64        `json:"index_low_c_days"`
	HighCDays   float64        `json:"index_high_c_days"`
	DesignCDays float64        `json:"design_c_days"`
	ExceededOn  string         `json:"exceeded_on,omitempty"`
	Exceedance  int64          `json:"exceedance,omitempty"`
	RecordedAt  string         `json:"recorded_at"`
	Caution     string         `json:"caution"`
}

func announcement(c store.StandingChange) Announcement {
	a := Announcement{
		Version: 1, Site: c.Site, Surface: c.Surface, Kind: c.Kind, SeasonStart: c.Season.String(), Day: c.Day.String(),
		From: c.From, To: c.To, Why: c.Why, LowCDays: c.Low, HighCDays: c.High, DesignCDays: c.DesignC,
		Exceedance: c.Exceedance, RecordedAt: c.RecordedAt.UTC().Format("2006-01-02T15:04:05.000000Z"), Caution: pipeline.Caution,
	}
	if c.Low == c.High {
		a.IndexCDays = &c.Low
	}
	if c.ExceededOn != nil {
		a.ExceededOn = c.ExceededOn.String()
	}
	return a
}

// announce puts changes on the bus and in the log, oldest first, and records
// each once the bus has it. A change may be told twice after a crash; its key
// on the bus stays the same.
func (s *Service) announce(ctx context.Context) error {
	for {
		changes, err := s.DB.Unannounced(ctx, 100)
		if err != nil || len(changes) == 0 {
			return err
		}
		for _, c := range changes {
			a := announcement(c)
			payload, err := json.Marshal(a)
			if err != nil {
				return fmt.Errorf("write announcement %d: %w", c.ID, err)
			}
			if err := s.Bus.Announce(ctx, c.Site, c.Surface, fmt.Sprintf("standing/%d", c.ID), payload); err != nil {
				return fmt.Errorf("announce change %d of %s/%s: %w", c.ID, c.Site, c.Surface, err)
			}
			if err := s.DB.Announced(ctx, c.ID); err != nil {
				return err
			}
			s.Log.Info("standing changed", zap.String("site", c.Site), zap.String("surface", c.Surface), zap.String("kind", string(c.Kind)),
				zap.String("from", string(c.From)), zap.String("to", string(c.To)), zap.String("why", c.Why), zap.String("day", a.Day),
				zap.Float64("index_low_c_days", c.Low), zap.Float64("index_high_c_days", c.High), zap.Float64("design_c_days", c.DesignC))
		}
	}
}
