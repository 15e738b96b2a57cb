package alerts

import (
	"context"

	"thawledger/alerts/gather"
	"thawledger/pipeline/store"
)

// tell notes, in the transaction that changes a standing, who is to be told of it.
func (s *Service) tell(ctx context.Context, j *store.Judging, row *store.StandingRow, c store.StandingChange) error {
	d := row.Design
	for i := range s.Sites {
		site := &s.Sites[i]
		if site.ID != d.Site {
			continue
		}
		var to []store.Hearer
		for k := range s.Recipients {
			r := &s.Recipients[k]
			for _, channel := range gather.Heard(r, site, d.Surface, c.From, row.State, c.Why) {
				to = append(to, store.Hearer{Recipient: r.ID, Channel: channel})
			}
		}
		if len(to) == 0 {
			return nil
		}
		about := gather.About(d.Site, d.Surface, d.Kind, d.Definition, d.Of, d.Direction, row.Label)
		return j.Tell(ctx, row, about, to, s.Now())
	}
	return nil
}
