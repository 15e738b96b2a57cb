package main

import (
	"bytes"
	"compress/gzip"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

func gzipped(text string) string {
	var b bytes.Buffer
	w := gzip.NewWriter(&b)
	_, _ = w.Write([]byte(text)) // memory does not fail
	_ = w.Close()
	return b.String()
}

// TestBadInput puts files that no one would want into a feed's folder, and finds
// each in the ledger with the place and the reason, and everything that is good
// used. Files that unpacking, fetching and disks make bad are tried in the
// packages that do these.
func TestBadInput(t *testing.T) {
	t.Parallel()
	const good = "2025-07-10 00:00,1\n2025-07-10 01:00,2\n2025-07-10 02:00,3\n2025-07-10 03:00,4\n"
	const held, done = "held_back", "done"
	cases := []struct {
		name, text  string
		state, says string // of the batch
		aside       string // code:line of what was set aside
		readings    int
	}{
		{"binary", "\x7fELF\x02\x01\x01\x00\x00\x00\x00\xff\xfe\x00" + strings.Repeat("\x00\x01\xff\n", 300), held, `no column "time"`, "", 0},
		{"empty", "", held, "the column names are due on line 1", "", 0},
		{"header only", "time,t\n", done, "", "", 0},
		{"line of three megabytes", "time,t\n" + good + "2025-07-10 04:00," + strings.Repeat("9", 3<<20) + "\n", done, "", "line_too_long:6", 4},
		{"NULs", "time,t\n" + good + "2025-07-10 04:00,\x005\n", done, "", "bad_text:6", 4},
		{"not UTF-8", "time,t\n" + good + "2025-07-10 04:00,\xff\n", done, "", "bad_text:6", 4},
		{"a million columns", "time,t\n" + good + strings.Repeat(",", 999_999) + "\n", done, "", "wrong_width:6", 4},
		{"a million names", "time,t" + strings.Repeat(",x", 400_000) + "\n", done, "", "", 0},
		{"wrong delimiter", "time;t\n2025-07-10 00:00;1\n", held, `no column "time"`, "", 0},
		{"mixed line ends", "time,t\r\n2025-07-10 00:00,1\n2025-07-10 01:00,2\r2025-07-10 02:00,3\r\n\r\n2025-07-10 03:00,4", done, "", "", 4},
		{"impossible date", "time,t\n" + good + "2025-02-30 00:00,5\n", done, "", "bad_time:6", 4},
		{"hour that is not", "time,t\n" + good + "2025-07-10 25:00,5\n", done, "", "bad_time:6", 4},
		{"infinity", "time,t\n" + good + "2025-07-10 04:00,Inf\n", done, "", "bad_number:6", 4},
		{"not a number", "time,t\n" + good + "2025-07-10 04:00,NaN\n", done, "", "bad_number:6", 4},
		{"huge number", "time,t\n" + good + "2025-07-10 04:00,1e400\n", done, "", "bad_number:6", 4},
		{"thousands mark", "time,t\n" + good + "2025-07-10 04:00,\"1,234.5\"\n", done, "", "bad_number:6", 4},
		{"no such warmth", "time,t\n" + good + "2025-07-10 04:00,999\n", done, "", "out_of_bounds:6", 4},
		{"quote not closed", "time,t\n" + good + "2025-07-10 04:00,\"5\n", done, "", "bad_quote:6", 4},
		{"gzip", gzipped("time,t\n2025-08-01 00:00,1\n2025-08-01 01:00,2\n"), done, "", "", 2},
		{"shortened gzip", gzipped("time,t\n" + good)[:40], held, "gzip", "", 0},
		{"gzip bomb", gzipped("time,t\n" + strings.Repeat("\n", 8<<20)), held, "times", "", 0},
		{"zip", "PK\x03\x04" + strings.Repeat("x", 100), held, "a zip archive; send gzip or zstd", "", 0},
		{"UTF-16", "\xff\xfet\x00i\x00m\x00e\x00", held, "utf-16", "", 0},
		{"nearly all bad", "time,t\n2025-07-10 00:00,1\nx,1\ny,2\nz,3\n", held, "3 of 4 rows (75 %) could not be read", "bad_time:3 bad_time:4 bad_time:5", 0},
	}
	files := map[string]string{"outside/secret.csv": "time,t\n" + good, "feed/whole.csv": "time,t\n" + good}
	for _, c := range cases {
		// Each says something of its own, so that none is taken for another.
		text := c.text
		if strings.Contains(text, good) {
			text = strings.Replace(text, good, strings.ReplaceAll(good, "2025-07-10", fmt.Sprintf("2024-07-%02d", 1+len(files))), 1)
		}
		files["feed/"+c.name+".csv"] = text
	}
	p := newPlace(t, fmt.Sprintf(hourlySettings, "Z", ""), files)
	for name, to := range map[string]string{"leads out": "../outside/secret.csv", "stays": "whole.csv", "loop": "loop.csv", "nowhere": "gone"} {
		if err := os.Symlink(to, filepath.Join(p.dir, "feed", name+".csv")); err != nil {
			t.Fatal(err)
		}
	}
	if err := os.Mkdir(filepath.Join(p.dir, "feed", "folder.csv"), 0o755); err != nil {
		t.Fatal(err)
	}
	var out bytes.Buffer
	if status := (program{out: &out, err: &out}).main(t.Context(), []string{"run", "--until-idle", "--settings", p.settings}); status != 1 || !strings.Contains(out.String(), "adds up") {
		t.Errorf("status %d\n%s", status, out.String())
	}
	got := p.rows(t, `select name || '|' || state || '|' || coalesce(readings, 0) || '|' ||
			coalesce((select string_agg(code || ':' || line, ' ' order by line) from thaw.set_aside a where a.batch_id = l.batch_id), '') || '|' ||
			coalesce(reason, '') from thaw.ledger l order by name`)
	for _, c := range cases {
		i := slices.IndexFunc(got, func(row string) bool { return strings.HasPrefix(strings.TrimLeft(row, `("`), c.name+".csv|") })
		if i < 0 {
			t.Errorf("%s: not in the ledger", c.name)
			continue
		}
		row := strings.ReplaceAll(strings.Trim(got[i], `()"`), `""`, `"`)
		f := strings.SplitN(row, "|", 5)
		if c.state == done && f[2] != fmt.Sprint(c.readings) || f[1] != c.state || f[3] != c.aside || !strings.Contains(f[4], c.says) {
			t.Errorf("%s: %s", c.name, row)
		}
	}
	names := p.rows(t, `select name from thaw.batches where name in ('leads out.csv', 'stays.csv', 'loop.csv', 'nowhere.csv', 'folder.csv', 'whole.csv') order by 1`)
	// The same bytes under two names are one batch.
	if len(names) != 1 {
		t.Errorf("of links and folders: %v", names)
	}
}
