package propose

import (
	"fmt"
	"strings"
	"testing"
)

func TestRefused(t *testing.T) {
	rows := func(format string, n int) string {
		var b strings.Builder
		for i := range n {
			fmt.Fprintf(&b, format+"\n", i+1, i%9)
		}
		return b.String()
	}
	tests := []struct {
		name, text string
		want       string // in the error
	}{
		{name: "empty", text: "", want: "the file is empty"},
		{name: "blank lines", text: "\n  \r\n\t\n", want: "the file is empty"},
		{name: "names only", text: "date,tmax,tmin\n", want: "no rows"},
		{name: "a line of 1 MB", text: strings.Repeat("1,", 1<<18), want: "longer than 16384 bytes"},
		{name: "binary", text: "\x7fELF\x02\x01\x01\x00\x00\x00\x00\x00\x00\x00\x00\x00\x03\x00", want: "binary"},
		{name: "gzip", text: "\x1f\x8b\x08\x00", want: "gzip"},
		{name: "spreadsheet", text: "PK\x03\x04\x14\x00", want: "spreadsheet"},
		{name: "UTF-16 with a mark", text: "\xff\xfed\x00a\x00t\x00e\x00", want: "UTF-16"},
		{name: "UTF-16 without", text: "d\x00a\x00t\x00e\x00,\x00t\x00\n\x00", want: "UTF-16"},
		{name: "NUL in each line", text: rows("2031-05-%02d,\x00%d", 20), want: "no UTF-8 text"},
		{name: "another character set", text: rows("2031-05-%02d,%d,warm \xfc", 20), want: "no UTF-8 text"},
		{name: "prose", text: "The thaw came early.\nNobody had expected that, not here.\nIt stayed.\n", want: "nothing like a table"},
		{name: "no date", text: "id,latitude,temp_c\n" + rows("%d,69.1,%d", 20), want: "no column of it that holds dates"},
		{name: "no temperature", text: "date,humidity\n" + rows("2031-05-%02d,%d", 20), want: "no column of it that holds air temperatures"},
		{name: "decimal comma", text: "date;temp_c\n" + rows("2031-05-%02d;1%d,5", 20), want: "decimal comma"},
		{name: "name of the month", text: "date,temp_c\n" + rows("%02d-May-2031,%d", 20), want: "name of a month"},
		{name: "12-hour clock", text: "time,temp_c\n" + rows("05/%02d/2031 11:00 PM,%d", 20), want: "12-hour clock"},
		{name: "offsets that change", text: "time,temp_c\n" + rows("2031-05-%02dT10:00:00-08:00,%d", 20) + rows("2031-06-%02dT10:00:00-07:00,%d", 20), want: "several offsets"},
		{name: "max and min in one column", text: "date,element,value\n" + rows("2031-05-%02d,TMAX,%d", 20) + rows("2031-05-%02d,TMIN,%d", 20), want: "a column of its own"},
		{name: "seconds since 1970", text: "time,temp_c\n" + rows("19355040%02d,%d", 20), want: "seconds since 1970"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			p, err := Look("f.csv", [][]byte{[]byte(tt.text)})
			if err == nil {
				t.Fatalf("proposed %v", outline(&p.Layout))
			}
			if !strings.Contains(err.Error(), tt.want) {
				t.Errorf("error %q, want %q in it", err, tt.want)
			}
		})
	}
	if _, err := Look("f.csv", nil); err == nil {
		t.Error("no sample gave a proposal")
	}
}

// A logger that lost power leaves a few lines of NULs; they are set aside, and
// the rest is read.
func TestFewBadLines(t *testing.T) {
	text := daily("date,tmax_c,tmin_c", "2006-01-02", on(2031, 5, 1), 40, 0, 10)
	lines := strings.SplitAfter(text, "\n")
	lines[20], lines[30] = strings.Repeat("\x00", 30)+"\n", "2031-05-30,\xff,1\n"
	p := mustLook(t, "f.csv", strings.Join(lines, ""))
	if p.Rows != 40 || p.SetAside != 2 || p.Read != 38 {
		t.Errorf("rows %d, read %d, set aside %d", p.Rows, p.Read, p.SetAside)
	}
	if !strings.Contains(strings.Join(p.Notes, "\n"), "2 of 41 lines") {
		t.Errorf("notes %q", p.Notes)
	}
}

// Names in another character set are called by number.
func TestNamesThatAreNotUTF8(t *testing.T) {
	p := mustLook(t, "f.csv", daily("date,Tmax (\xb0C),Tmin (\xb0C)", "2006-01-02", on(2031, 5, 1), 40, 0, 10))
	if got := []string{p.Layout.Values[0].Column, p.Layout.Values[1].Column}; got[0] != "2" || got[1] != "3" || p.Read != 40 {
		t.Errorf("columns %q, %d read", got, p.Read)
	}
	p = mustLook(t, "f.csv", strings.Replace(daily("date,t,t", "2006-01-02", on(2031, 5, 1), 40, 0, 10), "date,t,t", "date,Temp C,Temp C", 1))
	if got := p.Layout.Values[0].Column; got != "2" || p.Read != 40 {
		t.Errorf("a name that is there twice: column %q, %d read", got, p.Read)
	}
}
