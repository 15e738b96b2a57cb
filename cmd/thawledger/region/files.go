package region

import (
	"bytes"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"time"

	"thawledger/pipeline"
)

// Writer writes the stations' files into the folders of their feeds.
type Writer struct {
	dir     string
	weather map[string][]float64
}

// NewWriter makes the region's weather up; files go into a folder a layout in dir.
func NewWriter(dir string) (*Writer, error) {
	w := &Writer{dir: dir, weather: map[string][]float64{}}
	for i := range Stations {
		w.weather[Stations[i].ID] = Stations[i].weather()
		if err := os.MkdirAll(filepath.Join(dir, Stations[i].Layout), 0o755); err != nil {
			return nil, fmt.Errorf("make feed folder: %w", err)
		}
	}
	return w, nil
}

// History writes everything before Replay, one file a year and station (one a
// year for all stations of the layout tenths), and returns how many files.
func (w *Writer) History() (files int, err error) {
	firstYear, _, _ := First.Date()
	lastYear, _, _ := Replay.Date()
	for year := firstYear; year <= lastYear; year++ {
		from, to := pipeline.DayOf(year, time.January, 1), min(pipeline.DayOf(year, time.December, 31), Replay-1)
		n, err := w.send(from, to, fmt.Sprint(year), to+1, year == firstYear)
		files += n
		if err != nil {
			return files, err
		}
	}
	return files, nil
}

// Step writes what the stations send on the day to of the current season: the
// days after the last sending up to to, and what comes late. spoiled says that
// loggers and typists make their usual mistakes this time.
func (w *Writer) Step(from, to pipeline.Day, spoiled bool) error {
	if _, err := w.send(from, to, to.String(), to+1, spoiled); err != nil {
		return err
	}
	for i := range Stations {
		s := &Stations[i]
		if arrives := s.gap.to + pipeline.Day(s.lateBy); s.lateBy > 0 && arrives >= from && arrives <= to {
			text := w.rows(s, s.gap.from, s.gap.to, true)
			if err := w.put(s.Layout, fmt.Sprintf("%s_%s_recovered", s.ID, to), text, to+1); err != nil {
				return err
			}
		}
	}
	return nil
}

// send writes the days from from to to of every station.
func (w *Writer) send(from, to pipeline.Day, label string, written pipeline.Day, spoiled bool) (files int, err error) {
	var tenths bytes.Buffer
	for i := range Stations {
		s := &Stations[i]
		switch s.Layout {
		case "tenths":
			tenths.Write(w.rows(s, from, to, false))
			continue
		case "hourly":
			if year, _, _ := from.Date(); year < 2029 {
				continue // a new station
			}
		}
		text := w.rows(s, from, to, false)
		if spoiled {
			text = spoil(s, text, from >= Replay)
		}
		if err := w.put(s.Layout, s.ID+"_"+label, text, written); err != nil {
			return files, err
		}
		files++
	}
	return files + 1, w.put("tenths", "coast_"+label, tenths.Bytes(), written)
}

// put writes a file as a sender would: under another name first. Its time is the
// day after the last day in it.
func (w *Writer) put(layout, name string, text []byte, written pipeline.Day) error {
	final := filepath.Join(w.dir, layout, name+".csv")
	if err := os.WriteFile(final+".part", text, 0o644); err != nil {
		return fmt.Errorf("write feed file: %w", err)
	}
	at := written.Time().Add(6 * time.Hour)
	if err := os.Chtimes(final+".part", at, at); err != nil {
		return fmt.Errorf("date feed file: %w", err)
	}
	if err := os.Rename(final+".part", final); err != nil {
		return fmt.Errorf("name feed file: %w", err)
	}
	return nil
}

// rows writes days as the station's layout has them. Days of its gap are left
// without a value, or, in whole, written when they are recovered.
func (w *Writer) rows(s *Station, from, to pipeline.Day, whole bool) []byte {
	var b bytes.Buffer
	b.WriteString(headers[s.Layout])
	for d := from; d <= to; d++ {
		c := w.weather[s.ID][d-First]
		missed := !whole && d >= s.gap.from && d <= s.gap.to
		year, month, dom := d.Date()
		half := 3 + 1.5*math.Cos(2*math.Pi*float64(int(d)%365)/365)
		switch s.Layout {
		case "quoted":
			if missed {
				fmt.Fprintf(&b, "\"%s\",\"%s\",\"\",\"M\",\"\",\"M\"\r\n", s.ID, d)
			} else {
				fmt.Fprintf(&b, "\"%s\",\"%s\",\"%.1f\",\"\",\"%.1f\",\"\"\r\n", s.ID, d, c+half, c-half)
			}
		case "fahrenheit":
			fmt.Fprintf(&b, "%s;%d;%d;%.1f\n", s.ID, year, int(d-pipeline.DayOf(year, time.January, 1))+1, c*1.8+32)
		case "tenths":
			if missed {
				fmt.Fprintf(&b, "%s %04d%02d%02d -9999 -9999\n", s.ID, year, month, dom)
			} else {
				fmt.Fprintf(&b, "%s %04d%02d%02d %5.0f %5.0f\n", s.ID, year, month, dom, 10*(c+half), 10*(c-half))
			}
		case "hourly":
			for h := range 24 {
				t := d.Time().Add(time.Duration(h+8) * time.Hour) // station time is UTC-08:00
				fmt.Fprintf(&b, "%s,%.2f,1\n", t.Format("2006-01-02T15:04Z"), c+273.15-half*math.Cos(2*math.Pi*float64(h-3)/24))
			}
		}
	}
	return b.Bytes()
}

var headers = map[string]string{
	"quoted":     "\ufeff\"Station\",\"Date\",\"Max Temp (°C)\",\"Max Flag\",\"Min Temp (°C)\",\"Min Flag\"\r\n",
	"fahrenheit": "STN;YEAR;DOY;TAVG\n",
	"hourly":     "t,air_temperature,quality\n",
}

// spoil makes a few of the mistakes that real files have.
func spoil(s *Station, text []byte, replay bool) []byte {
	lines := strings.SplitAfter(string(text), "\n")
	if len(lines) < 8 {
		return text
	}
	switch s.ID {
	case "FELLMOOR":
		lines[3] = strings.Replace(lines[3], "-", "/", 1)    // a date by another habit
		lines[5] = strings.Replace(lines[5], `.`, `,`, 1)    // a decimal comma
		lines[6] = strings.Replace(lines[6], `""`, `"Q"`, 1) // a flag that nobody declared
	case "OSTERBRAE":
		lines[4] = strings.Replace(lines[4], ";", "; ;", 1) // a column too many
		lines[2] = strings.TrimRight(lines[2], "0123456789.\n") + "999.9\n"
	case "HALVDEN":
		if replay {
			lines[0] = "STN;YEAR;DOY;TEMP_MEAN\n" // the logger was replaced: another heading
		}
	}
	return []byte(strings.Join(lines, ""))
}
