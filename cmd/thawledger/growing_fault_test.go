package main

import (
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
)

// growing is a file's rows, 20 of them to an append, an hour each, with some
// that cannot be read.
func growing(appends int) (rows []string) {
	at := time.Date(2023, 1, 1, 0, 0, 0, 0, time.UTC)
	for n := range appends {
		var b strings.Builder
		for i := range 20 {
			c := -10 + 20*float64((n/37)%2) + float64(i%7)
			switch {
			case n%50 == 3 && i == 9:
				fmt.Fprintf(&b, "%s,none\n", at.Format("2006-01-02 15:04"))
			case n%90 == 7 && i == 2:
				b.WriteString("torn\n")
			default:
				fmt.Fprintf(&b, "%s,%.1f\n", at.Format("2006-01-02 15:04"), c)
			}
			at = at.Add(time.Hour)
		}
		rows = append(rows, b.String())
	}
	return rows
}

const (
	appendsMade  = 1000
	growingKills = 20
)

// TestGrowingFileKilled appends to a file a thousand times, often in the middle
// of a line, while the daemon is killed twenty times, and finds what one reading
// of the whole file leaves.
func TestGrowingFileKilled(t *testing.T) {
	if testing.Short() {
		t.Skip("takes a minute")
	}
	t.Parallel()
	settings := fmt.Sprintf(strings.Replace(hourlySettings, "settle: 0s,", `settle: 0s, every: "@every 1s",`, 1), "Z", ", grows: true")
	rows := growing(appendsMade)
	whole := newPlace(t, settings, map[string]string{"feed/log.csv": "time,t\n" + strings.Join(rows, "")})
	whole.run(t, "run", "--until-idle")

	seed := uint64(time.Now().UnixNano())
	t.Logf("seed %d", seed)
	random := rand.New(rand.NewPCG(seed, 2))
	p := newPlace(t, settings, map[string]string{"feed/log.csv": "time,t\n"})
	log, err := os.OpenFile(filepath.Join(p.dir, "feed", "log.csv"), os.O_APPEND|os.O_WRONLY, 0)
	if err != nil {
		t.Fatal(err)
	}
	defer log.Close()
	add := func(text string) {
		if _, err := log.WriteString(text); err != nil {
			t.Error(err)
		}
	}
	for kill := range growingKills {
		d := p.start(t, "run")
		for _, text := range rows[kill*appendsMade/growingKills : (kill+1)*appendsMade/growingKills] {
			cut := random.IntN(len(text))
			add(text[:cut])
			// The pace is the test's subject: the daemon looks while the file grows.
			time.Sleep(time.Duration(random.Int64N(int64(50 * time.Millisecond))))
			add(text[cut:])
		}
		if err := d.cmd.Process.Kill(); err != nil {
			t.Fatal(err)
		}
		<-d.ended
	}
	p.run(t, "run", "--until-idle")
	got := p.rows(t, `select count(*), count(*) filter (where from_byte > 0) from thaw.batches`)
	t.Logf("%d appends, %d kills; batches, and those that begin inside the file: %s", appendsMade, growingKills, got[0])
	same := `select 'readings', md5(string_agg(format('%s %s %s', start_utc, value_c, quality), ' ' order by start_utc)) from thaw.readings
		union all select part, hash from thaw.fingerprint_tables() where part in ('daily_values', 'air_index_daily', 'air_index_season')
		union all select 'set aside', md5(string_agg(format('%s %s %s', line, reason, raw), ' ' order by line)) from thaw.set_aside
		union all select 'rows', (sum(rows) || ' ' || sum(rows_set_aside))::text from thaw.batches`
	if diff := cmp.Diff(whole.rows(t, same), p.rows(t, same)); diff != "" {
		t.Errorf("(-read once +grown):\n%s", diff)
	}
}

// A file that is cut, or written anew, begins again; its old readings stay.
func TestGrowingFileBeginsAnew(t *testing.T) {
	settings := fmt.Sprintf(hourlySettings, "Z", ", grows: true")
	p := newPlace(t, settings, nil)
	for day, step := range []struct{ text, want string }{
		{hours(0, 1, 2), "2 of 0"},
		{hours(0, 1, 2, 3), "3 of 1"},                    // grown
		{hours(0, 1, 2, 3) + "2025-07-10 09:", "3 of 1"}, // in the middle of a line
		{hours(0, 1, 2, 3) + "2025-07-10 09:00,7\n", "4 of 2"},
		{hours(6, 5), "5 of 2"},    // rotated
		{hours(6, 8, 5), "6 of 2"}, // written anew, and longer
	} {
		// Dated now: a growing file that has stood still for a day is taken to its last byte.
		p.write(t, "feed/log.csv", step.text)
		p.run(t, "run", "--until-idle")
		got := p.rows(t, `select (select count(*) from thaw.readings) || ' of ' || (select count(*) from thaw.batches where from_byte > 0)`)
		if got[0] != `("`+step.want+`")` {
			t.Errorf("step %d: readings and pieces %v; want %s", day+1, got, step.want)
		}
	}
}
