package propose

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"

	"thawledger/pipeline"
)

// invented is a table of which the truth is known.
type invented struct {
	text            string
	rows            int
	formats         []string // that read its times right
	unit            pipeline.TempUnit
	unitSaid        bool
	subDaily, zoned bool
}

func drawTable(t *rapid.T) *invented {
	type written struct {
		golang   string
		formats  []string
		subDaily bool
		zoned    bool
	}
	when := rapid.SampledFrom([]written{
		{"2006-01-02", []string{"YYYY-MM-DD"}, false, false},
		{"2006/1/2", []string{"YYYY/M/D"}, false, false},
		{"20060102", []string{"YYYYMMDD"}, false, false},
		{"2006002", []string{"YYYYDDD"}, false, false},
		{"02.01.2006", []string{"DD.MM.YYYY", "D.M.YYYY"}, false, false},
		{"1/2/2006", []string{"M/D/YYYY"}, false, false},
		{"01/02/2006", []string{"MM/DD/YYYY", "M/D/YYYY"}, false, false},
		{"02/01/06", []string{"DD/MM/YY", "D/M/YY"}, false, false},
		{"2006-01-02 15:04", []string{"YYYY-MM-DD hh:mm"}, true, false},
		{"2006-01-02T15:04:05Z", []string{"YYYY-MM-DDThh:mm:ssZ"}, true, true},
		{"02.01.2006 15:04", []string{"DD.MM.YYYY hh:mm", "D.M.YYYY hh:mm"}, true, false},
		{"200601021504", []string{"YYYYMMDDhhmm"}, true, false},
	}).Draw(t, "when")
	delimiter := rapid.SampledFrom([]string{",", ";", "\t", "|"}).Draw(t, "delimiter")
	names := rapid.SampledFrom([][]string{
		{"date", "temp"}, {"date", "tmax", "tmin"}, {"date", "precip", "Tmax degC", "Tmin degC"}, {"Date", "Mean Temp (F)", "RH"}, {"when", "airtemp_c"}, {"time", "v"}, nil,
	}).Draw(t, "names")
	missing := rapid.SampledFrom([]string{"", "NaN", "NA", "M", "-9999", "-999.9", "---"}).Draw(t, "missing")
	x := &invented{rows: rapid.IntRange(12, 150).Draw(t, "rows"), formats: when.formats, subDaily: when.subDaily, zoned: when.zoned, unit: pipeline.DegC}
	header := strings.Join(names, delimiter)
	lower := strings.ToLower(header)
	x.unitSaid = strings.Contains(lower, "degc") || strings.Contains(lower, "(f)") || strings.Contains(lower, "_c")
	if strings.Contains(lower, "(f)") || !x.unitSaid && rapid.Bool().Draw(t, "degF") {
		x.unit = pipeline.DegF
	}
	columns := len(names)
	if names == nil {
		columns = rapid.IntRange(2, 3).Draw(t, "columns")
	} else {
		x.text = header + "\n"
	}
	start := on(2031, 1, 1).AddDate(0, 0, rapid.IntRange(0, 364).Draw(t, "start"))
	amplitude, middle := rapid.Float64Range(8, 20).Draw(t, "amplitude"), rapid.Float64Range(-8, 8).Draw(t, "middle")
	noise := rapid.SliceOfN(rapid.Float64Range(-3, 3), 40, 40).Draw(t, "noise")
	for i := range x.rows {
		at := start.AddDate(0, 0, i)
		if when.subDaily {
			at = start.Add(time.Duration(i) * time.Hour)
		}
		c := middle + amplitude*math.Cos(2*math.Pi*float64(at.YearDay()-205)/365.25) + noise[i%40]
		row := []string{at.Format(when.golang)}
		for k := 1; k < columns; k++ {
			v := c
			if names != nil {
				switch n := strings.ToLower(names[k]); {
				case strings.Contains(n, "max"):
					v = c + 5
				case strings.Contains(n, "min"):
					v = c - 5
				case n == "precip" || n == "rh":
					row = append(row, fmt.Sprint(i%7))
					continue
				}
			} else if k == 2 {
				v = c - 6
			}
			if x.unit == pipeline.DegF {
				v = v*1.8 + 32
			}
			cell := fmt.Sprintf("%.1f", v)
			if missing != "" && i%11 == 5 {
				cell = missing
			}
			row = append(row, cell)
		}
		x.text += strings.Join(row, delimiter) + "\n"
	}
	return x
}

// Of any simple table the proposal reads nearly all rows; and what it has wrong
// it asks about, with the truth among the answers.
func TestAnySimpleTable(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := drawTable(t)
		p, err := Look("invented.csv", [][]byte{[]byte(x.text)})
		if err != nil {
			t.Fatalf("%v\n%s", err, x.text)
		}
		if p.Rows != x.rows || float64(p.Read+p.WithoutValue) < 0.95*float64(x.rows) {
			t.Fatalf("%d rows of %d, %d read, %d without value, %d set aside (%s)\n%s\n%s", p.Rows, x.rows, p.Read, p.WithoutValue, p.SetAside, p.FirstSetAside, p.YAML(), x.text)
		}
		if p.WithoutValue > x.rows/8 {
			t.Fatalf("%d of %d rows without value\n%s\n%s", p.WithoutValue, x.rows, p.YAML(), x.text)
		}
		right := func(format string) bool { return slices.Contains(x.formats, format) }
		if f := p.Layout.Time.Format; !right(f) {
			if q := question(p, DayOrder); q == nil || !slices.ContainsFunc(q.Options, right) {
				t.Fatalf("format %q instead of %q, and asked %+v\n%s", f, x.formats, q, x.text)
			}
		}
		for _, v := range p.Layout.Values {
			if q := question(p, Unit); q == nil && (v.Unit != x.unit || !x.unitSaid) {
				t.Fatalf("unit %s, truth %s, and not asked\n%s", v.Unit, x.unit, x.text)
			}
		}
		if z := p.Layout.Time.Zone; x.zoned && z != utc || !x.zoned && (z != "station" || question(p, Zone) == nil) {
			t.Fatalf("zone %s, asked %+v\n%s", z, question(p, Zone), x.text)
		}
		if q := question(p, Covers); x.subDaily && q == nil {
			t.Fatalf("covers %s and not asked", p.Layout.Time.Covers)
		}
		comesTrue(t, p)
	})
}
