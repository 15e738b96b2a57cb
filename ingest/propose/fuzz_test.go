package propose

import (
	"bytes"
	"strings"
	"testing"
)

// cutInto cuts a file into the pieces that are looked at.
func cutInto(b []byte, pieces int) [][]byte {
	var out [][]byte
	for ; pieces > 1 && len(b) > 0; pieces-- {
		n := bytes.IndexByte(b[len(b)/pieces:], '\n')
		if n < 0 {
			break
		}
		n += len(b)/pieces + 1
		out = append(out, b[:n])
		b = b[n:]
	}
	return append(out, b)
}

func FuzzLook(f *testing.F) {
	for _, s := range shapes {
		b := load(f, s.name)
		f.Add(s.name, b[:min(len(b), 3000)], uint8(len(s.name)))
	}
	f.Add("a.csv", []byte("date,tmax\n2031-01-01,1\n"), uint8(1))
	f.Add("a.csv", []byte(strings.Repeat(",", 3000)+"\n1,2\n"), uint8(2))
	f.Add("a.csv", []byte("1-1-1,1\n2-2-2,2\n"), uint8(1))
	f.Fuzz(func(t *testing.T, name string, b []byte, pieces uint8) {
		p, err := Look(name, cutInto(b, int(pieces%4)+1))
		if err != nil {
			if strings.HasPrefix(err.Error(), "proposed layout: ") {
				t.Fatalf("%v\n%s", err, p.YAML())
			}
			return
		}
		if p.Rows != p.Read+p.WithoutValue+p.SetAside {
			t.Fatalf("rows %d, read %d, without value %d, set aside %d", p.Rows, p.Read, p.WithoutValue, p.SetAside)
		}
		comesTrue(t, p)
		p.Chart(80, 20)
	})
}

// Files made to take long: all are looked at whole, and work must not grow faster
// than the file. A deadline would measure the machine; the test's own is enough
// to find what would take minutes.
func TestHostileFiles(t *testing.T) {
	fill := func(line string) string { return strings.Repeat(line, 300<<10/len(line)) }
	wide := strings.Repeat("2031-01-01 10:00,", 900) + "1\n"
	for name, text := range map[string]string{
		"short lines": fill("1,2\n"), "dates": fill("1/1/31,2\n"), "wide": fill(wide), "wide numbers": fill(strings.Repeat("31,", 999) + "1\n"),
		"quotes": fill(`"a""b","1/1/31"` + "\n"), "open quotes": fill(`"a,1` + "\n"), "one line": fill("1,"), "blanks": fill("1 2 3 4 5 6 7 8\n"),
		"long words": fill(strings.Repeat("maxmin", 1000) + ",2\n"), "years": fill(strings.Repeat("2031,", 500) + "1\n"), "marks": fill("1/1/31/1/1/1/1/1/1,1,1\n"),
		"names": strings.Repeat("maxmintemp"+strings.Repeat("t", 20)+",", 400) + "x\n" + fill(strings.Repeat("1,", 400)+"1\n"),
	} {
		for _, pieces := range []int{1, 3} {
			if p, err := Look(name, cutInto([]byte(text), pieces)); err == nil {
				comesTrue(t, p)
			}
		}
	}
}
