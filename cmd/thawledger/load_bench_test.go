package main

import (
	"context"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"
	"go.uber.org/zap"

	"thawledger/pipeline/lifecycle"
	"thawledger/pipeline/pipelinetest"
	"thawledger/pipeline/settings"
	"thawledger/pipeline/store"
)

// BenchmarkLoad loads thirty years through the whole program, from CSV files to
// committed indices, beside a bare COPY of the same readings into the same
// table of another database of the same server, one transaction each. Run it
// with -benchtime 7x: the figures are medians of the rounds, of readings/s, their
// ratio to the bare COPY of the same round, and rows written per reading.
func BenchmarkLoad(b *testing.B) {
	b.Run("hourly, one station", func(b *testing.B) {
		benchmarkLoad(b, "hourly", []string{"FELL"}, func(file *strings.Builder, station string) {
			file.WriteString("time,t\n")
			for at := time.Date(1996, 1, 1, 8, 0, 0, 0, time.UTC); at.Year() < 2026; at = at.Add(time.Hour) {
				fmt.Fprintf(file, "%s,%.1f\n", at.Format("2006-01-02T15:04Z"), -8+18*math.Sin(float64(at.YearDay()-110)/58)+4*math.Sin(float64(at.Hour())/4))
			}
		})
	})
	b.Run("daily, ten stations", func(b *testing.B) {
		var stations []string
		for i := range 10 {
			stations = append(stations, fmt.Sprint("FELL", i))
		}
		benchmarkLoad(b, "daily", stations, func(file *strings.Builder, station string) {
			file.WriteString("date,max,min\n")
			for at := time.Date(1996, 1, 1, 0, 0, 0, 0, time.UTC); at.Year() < 2026; at = at.AddDate(0, 0, 1) {
				c := -8 + 18*math.Sin(float64(at.YearDay()-110)/58) + 4*math.Sin(float64(at.Unix()%977))
				fmt.Fprintf(file, "%s,%.1f,%.1f\n", at.Format(time.DateOnly), c+3, c-3)
			}
		})
	})
}

const loadSettings = `
data: data
stations:
%s
layouts:
  hourly:
    {delimiter: ",", names_line: 1, time: {columns: [time], format: "YYYY-MM-DDThh:mmZ", zone: Z, covers: instant},
     station: {file_name: "^([A-Z0-9]+)_"}, values: [{column: t, variable: air_temp, unit: degC}]}
  daily:
    {delimiter: ",", names_line: 1, time: {columns: [date], format: YYYY-MM-DD, zone: station, covers: day},
     station: {file_name: "^([A-Z0-9]+)_"}, values: [{column: max, variable: air_temp_max, unit: degC}, {column: min, variable: air_temp_min, unit: degC}]}
feeds:
  - {name: feed, folder: feed, settle: 0s, every: "@every 1h", layout: %s}
sites: []
`

func benchmarkLoad(b *testing.B, layout string, stations []string, write func(*strings.Builder, string)) {
	var ours, theirs, ratios []float64
	rowsPerReading := 0.0
	for b.Loop() {
		b.StopTimer()
		dir := publicFolder(b)
		rule := map[string]string{"hourly": "hourly", "daily": "max_min"}[layout]
		var lines strings.Builder
		for _, id := range stations {
			fmt.Fprintf(&lines, "  - {id: %s, latitude: 69, longitude: -120, utc_offset: \"-08:00\", daily_mean: %s}\n", id, rule)
		}
		set, _, err := settings.Parse("settings.yaml", fmt.Appendf(nil, loadSettings, lines.String(), layout), dir)
		if err != nil {
			b.Fatal(err)
		}
		feed := filepath.Join(dir, "feed")
		if err := os.Mkdir(feed, 0o755); err != nil {
			b.Fatal(err)
		}
		d, err := build(b.Context(), set, zap.NewNop(), time.Now)
		if err != nil {
			b.Fatal(err)
		}
		for _, id := range stations {
			var file strings.Builder
			write(&file, id)
			if err := os.WriteFile(filepath.Join(feed, id+"_all.csv"), []byte(file.String()), 0o644); err != nil {
				b.Fatal(err)
			}
		}
		ctx, stop := context.WithCancel(b.Context())
		ended := make(chan error, 1)
		b.StartTimer()
		started := time.Now()
		go func() { ended <- lifecycle.Run(ctx, zap.NewNop(), time.Minute, nil, d.stages(nil)...) }()
		if err := d.awaitIdle(ctx, stop, true, func(store.Pending) {}); err != nil {
			b.Fatal(err)
		}
		took := time.Since(started)
		b.StopTimer()
		if err := <-ended; err != nil {
			b.Fatal(err)
		}
		url := d.server.DSN("postgres")
		readings := number(b, url, `select count(*) from thaw.reading_values`)
		rows := number(b, url, `select (select count(*) from thaw.reading_values) + (select count(*) from thaw.daily_values)
			+ (select count(*) from thaw.air_index_daily) + (select count(*) from thaw.air_index_season)
			+ (select count(*) from thaw.batches) + (select count(*) from thaw.batch_parts)`)
		bare := copyBare(b, d.server.DSN)
		ours, theirs = append(ours, readings/took.Seconds()), append(theirs, readings/bare.Seconds())
		ratios, rowsPerReading = append(ratios, bare.Seconds()/took.Seconds()), rows/readings
		if err := d.close(b.Context()); err != nil {
			b.Fatal(err)
		}
		b.StartTimer()
	}
	b.ReportMetric(median(ours), "readings/s")
	b.ReportMetric(median(theirs), "bare_COPY/s")
	b.ReportMetric(median(ratios), "of_bare_COPY")
	b.ReportMetric(rowsPerReading, "rows/reading")
}

func median(v []float64) float64 {
	slices.Sort(v)
	return v[len(v)/2]
}

func number(b *testing.B, url, sql string) float64 {
	b.Helper()
	text := strings.Trim(pipelinetest.Rows(b, url, sql)[0], "()")
	n, err := strconv.ParseFloat(text, 64)
	if err != nil {
		b.Fatal(err)
	}
	return n
}

// copyBare copies the readings into an empty database of the same schema, and
// says how long that took.
func copyBare(b *testing.B, dsn func(string) string) time.Duration {
	b.Helper()
	ctx := b.Context()
	if err := pipelinetest.Exec(ctx, dsn("postgres"), "create database bare"); err != nil {
		b.Fatal(err)
	}
	db, err := store.Open(ctx, dsn("bare"), zap.NewNop())
	if err != nil {
		b.Fatal(err)
	}
	defer db.Close()
	if _, err := db.Apply(ctx, "test"); err != nil {
		b.Fatal(err)
	}
	from, err := pgx.Connect(ctx, dsn("postgres"))
	if err != nil {
		b.Fatal(err)
	}
	defer from.Close(ctx)
	columns := []string{"start_utc", "value_c", "series_id", "batch_id", "row_no", "quality"}
	found, err := from.Query(ctx, "select "+strings.Join(columns, ", ")+" from thaw.reading_values order by series_id, start_utc")
	if err != nil {
		b.Fatal(err)
	}
	rows, err := pgx.CollectRows(found, func(r pgx.CollectableRow) ([]any, error) { return r.Values() })
	if err != nil {
		b.Fatal(err)
	}
	to, err := pgx.Connect(ctx, dsn("bare"))
	if err != nil {
		b.Fatal(err)
	}
	defer to.Close(ctx)
	started := time.Now()
	if _, err := to.CopyFrom(ctx, pgx.Identifier{"thaw", "reading_values"}, columns, pgx.CopyFromRows(rows)); err != nil {
		b.Fatal(err)
	}
	return time.Since(started)
}
