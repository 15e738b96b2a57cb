package main

import (
	"context"
	"net"
	"time"

	"go.uber.org/zap"

	"thawledger/ingest"
	"thawledger/ingest/push"
)

// takePushed takes files that are pushed to feeds, until ctx ends.
func (d *daemon) takePushed(ctx context.Context) error {
	feeds := map[string]push.Feed{}
	for i := range d.set.Feeds {
		if f := &d.set.Feeds[i]; f.Push != nil {
			feeds[f.Name] = push.Feed{TokenFile: f.Push.TokenFile, MaxBytes: f.Push.MaxBytes}
		}
	}
	log := d.log.Named("push")
	l := d.set.Listen
	return push.Server{
		Address: l.Address, CertificateFile: l.CertificateFile, KeyFile: l.KeyFile, Plain: l.Plain,
		Handler: push.NewHandler(push.Handler{Feeds: feeds, Deliver: d.deliverPushed, Now: time.Now, Log: log}),
	}.Run(ctx, func(at net.Addr) { log.Info("files can be pushed", zap.Stringer("address", at)) })
}

// deliverPushed enters a pushed file. Once it is on its way it is not broken off
// because the sender has gone.
func (d *daemon) deliverPushed(ctx context.Context, p push.Delivery) (push.Outcome, error) {
	r, err := d.ingest.Deliver(context.WithoutCancel(ctx), ingest.Delivery{Feed: p.Feed, Name: p.Name, SourceTime: p.SourceTime, Body: p.Body})
	if err != nil {
		return push.Outcome{}, err
	}
	if r.Known {
		return push.Outcome{State: "known"}, nil
	}
	out := push.Outcome{Batch: r.Batch, State: r.Ledger.State, Rows: r.Ledger.Rows, RowsRead: r.Ledger.RowsRead,
		RowsWithoutValue: r.Ledger.RowsWithoutValue, RowsSetAside: r.Ledger.RowsSetAside}
	if r.Ledger.Reason != nil {
		out.Reason = *r.Ledger.Reason
	}
	if out.State == "on its way" || out.State == "done" {
		out.State = "read"
	}
	return out, nil
}
