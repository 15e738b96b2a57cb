package propose

import "strings"

// run is a run of digits that the cells of a column have in common.
type run struct {
	least, most int  // digits
	zeros       bool // some begin with 0 and have two digits
	same        string
	varies      bool
}

// shape is what the cells of a column have in common.
type shape struct {
	between []string // what stands before each run, and after the last
	runs    []run
}

// evenShare is the share of a column's cells that must have the same shape.
const evenShare = 0.9

// shapeOf returns the shape of most cells; nil if there is none.
func shapeOf(cells []string) *shape {
	counts := map[string]int{}
	filled, best := 0, ""
	keys := make([]string, len(cells))
	var b strings.Builder
	for i, cell := range cells {
		if cell == "" || len(cell) > 40 {
			continue
		}
		filled++
		b.Reset()
		digits := false
		for j := range len(cell) {
			if d := cell[j] >= '0' && cell[j] <= '9'; !d {
				b.WriteByte(cell[j])
				digits = false
			} else if !digits {
				b.WriteByte('0')
				digits = true
			}
		}
		keys[i] = b.String()
		if _, seen := counts[keys[i]]; !seen && len(counts) > 50 {
			continue
		}
		counts[keys[i]]++
		if counts[keys[i]] > counts[best] {
			best = keys[i]
		}
	}
	if best == "" || float64(counts[best]) < evenShare*float64(filled) || !strings.Contains(best, "0") || strings.Count(best, "0") > 10 {
		return nil
	}
	s := &shape{between: strings.Split(best, "0")}
	s.runs = make([]run, len(s.between)-1)
	for i, cell := range cells {
		if keys[i] != best {
			continue
		}
		at := 0
		for k := range s.runs {
			at += len(s.between[k])
			end := at
			for end < len(cell) && cell[end] >= '0' && cell[end] <= '9' {
				end++
			}
			s.runs[k].add(cell[at:end])
			at = end
		}
	}
	return s
}

func (r *run) add(digits string) {
	n := len(digits)
	if r.most == 0 {
		r.least, r.same = n, digits
	}
	r.least, r.most = min(r.least, n), max(r.most, n)
	r.zeros = r.zeros || n == 2 && digits[0] == '0'
	r.varies = r.varies || digits != r.same
}

func (r *run) is(n int) bool { return r.least == n && r.most == n }

// short returns the field of one letter, or of two where all have two digits
// and some, or others of the same date, a leading 0.
func (r *run) short(letter string, padded bool) string {
	if r.is(2) && (r.zeros || padded) {
		return letter + letter
	}
	return letter
}

// padded reports whether dates are written with leading zeros. Those of the
// form 2031-05-20 always are; of others some cell has to show it.
func (s *shape) padded() bool {
	zeros := s.runs[0].is(4) && len(s.runs) >= 3 && s.between[1] == "-"
	for _, r := range s.runs[:min(len(s.runs), 3)] {
		if r.least < 2 {
			return false
		}
		zeros = zeros || r.is(2) && r.zeros
	}
	return zeros
}
