package main

import (
	"context"
	"errors"
	"fmt"
	"path/filepath"
	"time"

	"go.uber.org/zap"

	"thawledger/alerts"
	"thawledger/alerts/send"
	"thawledger/indices"
	"thawledger/ingest"
	"thawledger/ingest/archive"
	"thawledger/pipeline/bus"
	"thawledger/pipeline/lifecycle"
	"thawledger/pipeline/localpg"
	"thawledger/pipeline/settings"
	"thawledger/pipeline/store"
)

// daemon is everything that a running process is made of.
//
//	folder of a feed                                      settings.yaml
//	      |                                                     |
//	   ingest ------ archive, ledger --------------------.      |
//	      |                                              v      v
//	     bus ----> indices ---- readings, days, ---> PostgreSQL (TimescaleDB)
//	      ^                     indices, changes         |
//	      |                                              v
//	      '------------------- alerts <--- changes, standings, exceedances
//	                                                     |
//	          mail, webhooks, CAP feeds <--- send <--- notices
type daemon struct {
	log     *zap.Logger
	set     *settings.Settings
	release func() // of the data folder
	server  *localpg.Server
	db      *store.DB
	bus     *bus.Bus
	ingest  *ingest.Service
	indices *indices.Service
	alerts  *alerts.Service
	sender  *send.Sender
	now     func() time.Time
}

// build starts the services that the settings ask for and joins the stages. now
// is the clock. What has been started is stopped again if anything fails.
func build(ctx context.Context, set *settings.Settings, log *zap.Logger, now func() time.Time) (d *daemon, err error) {
	d = &daemon{log: log, set: set, now: now}
	defer func() {
		if err != nil {
			err = errors.Join(err, d.close(context.WithoutCancel(ctx)))
		}
	}()
	if d.release, err = lifecycle.LockFolder(set.Data); err != nil {
		return d, err
	}
	if err := d.openStore(ctx); err != nil {
		return d, err
	}
	if err := d.prepare(ctx); err != nil {
		return d, err
	}
	d.bus, err = bus.Open(ctx, busConfig(set, log))
	if err != nil {
		return d, err
	}
	kept, err := archive.Open(filepath.Join(set.Data, "archive"))
	if err != nil {
		return d, err
	}
	taker, err := d.bus.NewTaker(ctx)
	if err != nil {
		return d, err
	}
	for i := range set.Feeds {
		if f := &set.Feeds[i]; f.Remote != nil {
			// The copy of a file on a web server is read as a folder is.
			f.Folder, f.Pattern, f.Settle = filepath.Join(set.Data, "fetched", f.Name), "*", 0
		}
	}
	d.ingest = ingest.New(ingest.Config{
		DB: d.db, Bus: d.bus, Archive: kept, Feeds: set.Feeds, Log: log.Named("ingest"), Now: now,
		RepublishAfter: set.Work.RepublishAfter, RepublishAllowed: set.Work.RepublishAllowed,
	})
	d.indices = &indices.Service{
		DB: d.db, Taker: taker, Nudge: d.bus.Nudge, Log: log.Named("indices"),
		CommitReadings: set.Work.CommitReadings, FailuresAllowed: set.Work.FailuresAllowed, Workers: 2,
	}
	if d.sender, err = d.newSender(now); err != nil {
		return d, err
	}
	d.alerts = &alerts.Service{DB: d.db, Bus: d.bus, Log: log.Named("alerts"), Now: now, Recipients: set.Recipients, Sites: set.Sites, Wake: d.sender.Wake}
	return d, nil
}

// openStore connects to the database of the settings, or to a private server
// that it starts in the data folder.
func (d *daemon) openStore(ctx context.Context) error {
	url := d.set.Store.URL
	if url == "" {
		server, err := startPrivate(ctx, d.set, d.log)
		if err != nil {
			return err
		}
		d.server = server
		url = server.DSN("postgres")
	}
	db, err := store.Open(ctx, url, d.log.Named("store"))
	if err != nil {
		return err
	}
	d.db = db
	return nil
}

// startPrivate starts PostgreSQL in the data folder, with TimescaleDB if it is
// to be had.
func startPrivate(ctx context.Context, set *settings.Settings, log *zap.Logger) (*localpg.Server, error) {
	var prefer []string
	if set.Store.Binaries != "" {
		prefer = append(prefer, set.Store.Binaries)
	}
	found, err := localpg.Find(prefer)
	if err != nil {
		return nil, err
	}
	dir := filepath.Join(set.Data, "postgresql")
	install, err := localpg.Pick(dir, found)
	if err != nil {
		return nil, err
	}
	return localpg.Start(ctx, localpg.Config{Dir: dir, Install: install, Durable: true, Log: log.Named("postgresql")})
}

// prepare brings schema and tables into line with program and settings.
func (d *daemon) prepare(ctx context.Context) error {
	applied, err := d.db.Apply(ctx, version())
	if err != nil {
		return err
	}
	for _, step := range applied {
		d.log.Info("schema step applied", zap.String("step", step.Name))
	}
	d.log.Info("database", zap.String("postgresql", d.db.Version), zap.String("timescaledb", orNone(d.db.Timescale)))
	return d.db.State(ctx, store.Stated{
		Hash: d.set.Hash, YAML: d.set.Text(), Program: version(),
		Stations: d.set.Stations, Feeds: d.set.Feeds, Sites: d.set.Sites,
	})
}

func orNone(s string) string {
	if s == "" {
		return "none, ordinary tables"
	}
	return s
}

func busConfig(set *settings.Settings, log *zap.Logger) bus.Config {
	c := bus.Config{URL: set.Bus.URL, CredentialsFile: set.Bus.CredentialsFile, Replicas: set.Bus.Replicas, Log: log.Named("bus")}
	if set.Bus.URL == "" {
		c.Replicas = 1
		c.Embedded = &bus.Embedded{Dir: filepath.Join(set.Data, "bus"), Listen: set.Bus.Listen}
	}
	return c
}

// stages returns the stages in the order in which they are to stop.
func (d *daemon) stages(only []string) []lifecycle.Stage {
	var out []lifecycle.Stage
	for _, s := range []lifecycle.Stage{
		{Name: "ingest", Run: d.ingest.Run},
		{Name: "indices", Run: d.indices.Run},
		{Name: "alerts", Run: func(intake, _ context.Context) error { return d.alerts.Run(intake) }},
	} {
		if wanted(only, s.Name) {
			out = append(out, s)
		}
	}
	if wanted(only, "alerts") {
		out = append(out, d.sending(d.now)...)
	}
	if d.set.Listen.Address != "" && wanted(only, "ingest") && !d.ingest.DeliveriesOnly {
		out = append([]lifecycle.Stage{{Name: "push", Run: func(intake, _ context.Context) error { return d.takePushed(intake) }}}, out...)
	}
	return out
}

// close stops the services, bus before store.
func (d *daemon) close(ctx context.Context) error {
	ctx, cancel := context.WithTimeout(ctx, 30*time.Second)
	defer cancel()
	var failed []error
	if d.bus != nil {
		failed = append(failed, d.bus.Close(ctx))
	}
	if d.db != nil {
		d.db.Close()
	}
	if d.server != nil {
		failed = append(failed, d.server.Stop(ctx))
	}
	if d.release != nil {
		d.release()
	}
	if err := errors.Join(failed...); err != nil {
		return fmt.Errorf("stop services: %w", err)
	}
	return nil
}
