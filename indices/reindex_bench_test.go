package indices_test

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"
	"go.uber.org/zap"

	"thawledger/indices"
	"thawledger/pipeline/pipelinetest"
)

const (
	benchStations  = 100
	benchFirstYear = 1991
	benchYears     = 30
)

// rowsSQL makes tables of a row a day, as SQL would have them, from thaw.daily_values.
const rowsSQL = `
create table rows_daily (station text collate "C" not null, day date not null, mean_c double precision not null, primary key (station, day));
insert into rows_daily select station, day, mean_c from thaw.daily_values where mean_c is not null order by station, day;
create table rows_index (like thaw.air_index_daily);
alter table rows_index add primary key (station, day);
create index on rows_index (day);
create table rows_season (station text collate "C", kind text, definition text, season_start date, index_c_days double precision,
	first_day date, last_day date, primary key (station, kind, definition, season_start));
analyze rows_daily;`

// windowSQL works the same indices out by window functions: running values,
// curve and sum of both kinds, and the seasons.
const windowSQL = `
truncate rows_index, rows_season;
with s as (
	select station, day, mean_c as x,
		case when to_char(day, 'MMDD') < '0115' then make_date(extract(year from day)::int - 1, 1, 15) else make_date(extract(year from day)::int, 1, 15) end as ts,
		case when to_char(day, 'MMDD') < '0715' then make_date(extract(year from day)::int - 1, 7, 15) else make_date(extract(year from day)::int, 7, 15) end as fs
	from rows_daily),
c as (
	select *, sum(x) over t as tc, sum(greatest(x, 0)) over t as tsum, sum(-x) over f as fc, sum(greatest(-x, 0)) over f as fsum
	from s window t as (partition by station, ts order by day), f as (partition by station, fs order by day)),
r as (
	select *, tc - least(0, min(tc) over t) as trun, fc - least(0, min(fc) over f) as frun
	from c window t as (partition by station, ts order by day), f as (partition by station, fs order by day)),
m as (
	select *, max(trun) over t as tcurve, max(frun) over f as fcurve
	from r window t as (partition by station, ts order by day), f as (partition by station, fs order by day))
insert into rows_index (day, station, thaw_season, freeze_season,
	thaw_running_c_days, thaw_curve_c_days, thaw_curve_low_c_days, thaw_curve_high_c_days, thaw_sum_c_days, thaw_sum_low_c_days, thaw_sum_high_c_days,
	freeze_running_c_days, freeze_curve_c_days, freeze_curve_low_c_days, freeze_curve_high_c_days, freeze_sum_c_days, freeze_sum_low_c_days, freeze_sum_high_c_days)
select day, station, ts, fs, trun, tcurve, tcurve, tcurve, tsum, tsum, tsum, frun, fcurve, fcurve, fcurve, fsum, fsum, fsum from m;
insert into rows_season
select station, 'thaw', 'curve', thaw_season, max(thaw_curve_c_days),
	(array_agg(day order by thaw_curve_c_days desc, day))[1], (array_agg(day order by thaw_curve_c_days desc, day))[1] from rows_index group by 1, 4
union all select station, 'thaw', 'sum', thaw_season, max(thaw_sum_c_days), min(day) filter (where thaw_sum_c_days > 0), max(day) from rows_index group by 1, 4
union all select station, 'freeze', 'curve', freeze_season, max(freeze_curve_c_days),
	(array_agg(day order by freeze_curve_c_days desc, day))[1], (array_agg(day order by freeze_curve_c_days desc, day))[1] from rows_index group by 1, 4
union all select station, 'freeze', 'sum', freeze_season, max(freeze_sum_c_days), min(day) filter (where freeze_sum_c_days > 0), max(day) from rows_index group by 1, 4;`

// network is a database with complete daily values of 100 stations over 30
// years, invented: a yearly wave with noise that stays for days.
func network(b *testing.B) *pipelinetest.Database {
	db := pipelinetest.New(b)
	ctx := b.Context()
	conn, err := pgx.Connect(ctx, db.URL)
	if err != nil {
		b.Fatal(err)
	}
	defer conn.Close(context.WithoutCancel(ctx))
	exec := func(sql string, args ...any) {
		if _, err := conn.Exec(ctx, sql, args...); err != nil {
			b.Fatalf("%.200s: %v", sql, err)
		}
	}
	random := rand.New(rand.NewPCG(1, 2))
	for s := range benchStations {
		station := fmt.Sprintf("S%03d", s)
		exec(`insert into thaw.stations (station, name, latitude_deg, longitude_deg, elevation_m, utc_offset_s, day_starts_s, mean_rule, min_hours,
			max_hole_hours, base_c, fill_days, thaw_year_starts, freeze_year_starts)
			values ($1, $1, 68, -140, 0, -28800, 0, 'as_reported', 20, 3, 0, 2, '01-15', '07-15')`, station)
		noise := 0.0
		first := time.Date(benchFirstYear, 1, 1, 0, 0, 0, 0, time.UTC)
		for month := first; month.Year() < benchFirstYear+benchYears; month = month.AddDate(0, 1, 0) {
			next := month.AddDate(0, 1, 0)
			var means []float64
			for day := month; day.Before(next); day = day.AddDate(0, 0, 1) {
				noise = 0.7*noise + 2.5*random.NormFloat64()
				means = append(means, math.Round(10*(-6+20*math.Cos(float64(day.YearDay()-200)/58.09)+noise))/10)
			}
			exec(`insert into thaw.daily_blocks (station, month, first_day, last_day, mean_rule, mean_c) values ($1, $2, $2, $3, 'as_reported', $4)`,
				station, month, next.AddDate(0, 0, -1), means)
		}
	}
	exec(`analyze`)
	return db
}

// BenchmarkReindex fills gaps and works out anew all indices of 100 stations of
// 30 years, database to database, one station after another and as the service does,
// with four workers, beside one statement of window functions on a table of a row a day, which leaves the same
// answers in a table of a row a day. Both are measured in every round; the
// answers are compared after the last. Run it with -benchtime 3x or more.
func BenchmarkReindex(b *testing.B) {
	db := network(b)
	ctx := b.Context()
	if err := pipelinetest.Exec(ctx, db.URL, rowsSQL); err != nil {
		b.Fatal(err)
	}
	svc := &indices.Service{DB: db.DB, Nudge: func() error { return nil }, Log: zap.NewNop(), Workers: 4}
	var ours, workers, sql time.Duration
	b.ResetTimer()
	for range b.N {
		start := time.Now()
		for s := range benchStations {
			if err := svc.Reindex(ctx, fmt.Sprintf("S%03d", s)); err != nil {
				b.Fatal(err)
			}
		}
		ours += time.Since(start)
		if err := pipelinetest.Exec(ctx, db.URL, `update thaw.stations set reindex = true`); err != nil {
			b.Fatal(err)
		}
		start = time.Now()
		if err := svc.MakeMarked(ctx); err != nil {
			b.Fatal(err)
		}
		workers += time.Since(start)
		start = time.Now()
		if err := pipelinetest.Exec(ctx, db.URL, windowSQL); err != nil {
			b.Fatal(err)
		}
		sql += time.Since(start)
	}
	b.StopTimer()
	n := time.Duration(b.N)
	b.ReportMetric(float64((ours / n).Milliseconds()), "ms/reindex")
	b.ReportMetric(float64((sql / n).Milliseconds()), "ms/windows")
	b.ReportMetric(float64((workers / n).Milliseconds()), "ms/by_4_workers")
	b.ReportMetric(float64(sql)/float64(ours), "windows/reindex")
	b.ReportMetric(float64(sql)/float64(workers), "windows/by_4_workers")

	if err := pipelinetest.Exec(ctx, db.URL, `analyze`); err != nil {
		b.Fatal(err)
	}
	got := db.Rows(b, `select count(*), max(abs(a.thaw_running_c_days - r.thaw_running_c_days)) < 1e-8, max(abs(a.thaw_curve_c_days - r.thaw_curve_c_days)) < 1e-8,
			max(abs(a.thaw_sum_c_days - r.thaw_sum_c_days)) < 1e-8, max(abs(a.freeze_running_c_days - r.freeze_running_c_days)) < 1e-8,
			max(abs(a.freeze_curve_c_days - r.freeze_curve_c_days)) < 1e-8, max(abs(a.freeze_sum_c_days - r.freeze_sum_c_days)) < 1e-8
		from rows_index r join thaw.air_index_daily a using (station, day, thaw_season, freeze_season)
		where thaw_season >= '1991-01-15' and freeze_season >= '1991-07-15'`)
	want := fmt.Sprintf("(%d,t,t,t,t,t,t)", benchStations*int(time.Date(benchFirstYear+benchYears, 1, 1, 0, 0, 0, 0, time.UTC).
		Sub(time.Date(benchFirstYear, 7, 15, 0, 0, 0, 0, time.UTC)).Hours()/24))
	if got[0] != want {
		b.Fatalf("answers differ: %s; want %s", got[0], want)
	}
	readers(b, db)
}

// readers times reading the result, one index with its bounds or all columns: the
// view of blocks beside the table of rows.
func readers(b *testing.B, db *pipelinetest.Database) {
	const usual = "station, day, thaw_curve_c_days, thaw_curve_low_c_days, thaw_curve_high_c_days"
	for _, q := range []struct{ name, columns, where string }{
		{"station", usual, "station = 'S050'"},
		{"station_all_columns", "*", "station = 'S052'"},
		{"station_year", usual, "station = 'S051' and day between '2005-01-01' and '2005-12-31'"},
		{"day", usual, "day = '2005-07-20'"},
		{"day_all_columns", "*", "day = '2005-07-21'"},
	} {
		took := map[string]time.Duration{}
		for range 20 {
			for _, from := range []string{"rows_index", "thaw.air_index_daily"} {
				start := time.Now()
				if err := pipelinetest.Exec(b.Context(), db.URL, `select `+q.columns+` from `+from+` where `+q.where); err != nil {
					b.Fatal(err)
				}
				took[from] += time.Since(start)
			}
		}
		b.ReportMetric(float64(took["thaw.air_index_daily"])/float64(took["rows_index"]), "view/rows_by_"+q.name)
	}
}
