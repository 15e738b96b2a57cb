package main

import (
	"fmt"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// Once a record is approved, corrections of its days wait, and what is decided
// on them holds; later days, and repetitions that change nothing, do not wait.
func TestApproval(t *testing.T) {
	t.Parallel()
	for _, decision := range []string{"accept", "reject"} {
		t.Run(decision, func(t *testing.T) {
			p := newPlace(t, fmt.Sprintf(hourlySettings, "Z", ""), nil)
			p.dated(t, "feed/a.csv", hours(0, 1, 2, 3), 1)
			p.run(t, "run", "--until-idle")
			p.run(t, "approve", "through", "TARN", "2025-07-10", "--reason", "looked through", "--author", "A. Ledgerwood")
			// 00:00 is the same, 01:00 is corrected, 04:00 is new, and so is the next day
			p.dated(t, "feed/b.csv", "time,t\n2025-07-10 00:00,1\n2025-07-10 01:00,9\n2025-07-10 04:00,5\n2025-07-11 00:00,6\n", 2)
			p.run(t, "run", "--until-idle")
			held := []string{`("10 00",1,b.csv)`, `("10 01",2,a.csv)`, `("10 02",3,a.csv)`, `("11 00",6,b.csv)`}
			if diff := cmp.Diff(held, p.rows(t, readingsByHour)); diff != "" {
				t.Errorf("before the decision: %s", diff)
			}
			if got := p.run(t, "approve", "list"); !strings.Contains(got, "2025-07-10") || !strings.Contains(got, "2 readings") {
				t.Errorf("list:\n%s", got)
			}
			p.run(t, "approve", decision, "2", "--reason", "by the field book", "--author", "A. Ledgerwood")
			p.run(t, "run", "--until-idle")
			want, history := held, `("10 01",9) ("10 04",5)`
			if decision == "accept" {
				want = []string{`("10 00",1,b.csv)`, `("10 01",9,b.csv)`, `("10 02",3,a.csv)`, `("10 04",5,b.csv)`, `("11 00",6,b.csv)`}
				history = `("10 01",2)`
			}
			if diff := cmp.Diff(want, p.rows(t, readingsByHour)); diff != "" {
				t.Errorf("after it: %s", diff)
			}
			if got := strings.Join(p.rows(t, `select to_char(start_utc, 'DD HH24'), value_c from thaw.readings_replaced order by 1, 2`), " "); got != history {
				t.Errorf("history %s; want %s", got, history)
			}
			if got := p.run(t, "approve", "list"); !strings.Contains(got, "nothing waits") {
				t.Errorf("list:\n%s", got)
			}
			if got := p.run(t, "ledger"); !strings.Contains(got, "adds up") {
				t.Errorf("ledger:\n%s", got)
			}
			p.run(t, "approve", "withdraw", "TARN", "2025-07-09", "--reason", "too early")
			p.dated(t, "feed/c.csv", hours(0, 7), 3)
			p.run(t, "run", "--until-idle")
			if got := p.rows(t, readingsByHour); got[0] != `("10 00",7,c.csv)` {
				t.Errorf("with the approval withdrawn: %v", got)
			}
		})
	}
}
