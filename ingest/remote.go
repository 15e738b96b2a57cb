package ingest

import (
	"context"
	"fmt"

	"go.uber.org/zap"

	"thawledger/ingest/fetch"
	"thawledger/pipeline"
)

// remote is what keeps the copy of a feed's file up to date, or why there is none.
type remote struct {
	*fetch.Fetcher
	err error
}

// newRemotes makes ready to fetch. The copies lie in the feeds' folders.
func newRemotes(feeds []pipeline.Feed) map[string]remote {
	out := map[string]remote{}
	hosts := &fetch.Hosts{}
	for i := range feeds {
		f := &feeds[i]
		if f.Remote == nil {
			continue
		}
		fetcher, err := fetch.New(fetch.Config{URL: f.Remote.URL, User: f.Remote.User, PasswordFile: f.Remote.PasswordFile,
			BearerFile: f.Remote.BearerFile, Timeout: f.Remote.Timeout, Folder: f.Folder, Grows: f.Grows, Hosts: hosts})
		out[f.Name] = remote{fetcher, err}
	}
	return out
}

// fetch brings the copy of a feed's file up to date; nothing for other feeds.
func (s *Service) fetch(ctx context.Context, f *pipeline.Feed) error {
	r, ok := s.remotes[f.Name]
	if !ok {
		return nil
	}
	changed, err := false, r.err
	if err == nil {
		changed, err = r.Fetch(ctx)
	}
	if err != nil {
		return fmt.Errorf("fetch feed %s: %w", f.Name, err)
	}
	if changed {
		s.Log.Info("file fetched", zap.String("feed", f.Name))
	}
	return nil
}

func (s *Service) closeRemotes() {
	for _, r := range s.remotes {
		if r.Fetcher != nil {
			r.Close()
		}
	}
}
