package store

// verdict is what has to be written.
type verdict struct {
	fresh, changed, moved []row // moved: the same value by a later batch or row
	replaced              []loser
	waiting               []row // would change an approved day
}

type loser struct{ lost, winner row }

// passOver takes out rows that a later batch has made void, and keeps their
// history.
func (v *verdict) passOver(rows []row, spans []spanInForce, states []PartState, fates []Fate) []row {
	if len(spans) == 0 {
		return rows
	}
	left := rows[:0]
	for i := range rows {
		r := rows[i]
		s := void(spans, states[r.part].FeedID, &r)
		if s == nil {
			left = append(left, r)
			continue
		}
		if n := len(rows); i+1 < n && rows[i+1].series == r.series && rows[i+1].startS == r.startS && rows[i+1].batch == r.batch {
			fates[r.part].Repeated++
		} else {
			fates[r.part].Unchanged++
		}
		v.replaced = append(v.replaced, loser{r, row{batch: s.batch}})
	}
	return left
}

// decide settles who stays for each key and counts what became of each part.
// What would change an approved day waits, and counts as unchanged.
func (v *verdict) decide(rows []row, there map[key]row, fates []Fate, g *guard) {
	for i := 0; i < len(rows); {
		j := i + 1
		for j < len(rows) && rows[j].series == rows[i].series && rows[j].startS == rows[i].startS {
			j++
		}
		winner := rows[j-1]
		old, known := there[key{winner.series, winner.startS}]
		if known && !old.before(&winner) {
			winner = old
		}
		for k, r := range rows[i:j] {
			if r == winner {
				continue
			}
			// Rows of one batch stand side by side, the last of them counting.
			repeated := i+k+1 < j && rows[i+k+1].batch == r.batch
			if repeated || r.batch == winner.batch {
				fates[r.part].Repeated++
			} else {
				fates[r.part].Unchanged++
			}
			v.lose(r, winner)
		}
		differs := !known || old.valueC != winner.valueC || old.quality != winner.quality
		if winner.part >= 0 && differs && g.keeps(&winner) {
			if !g.states[winner.part].Rejected {
				v.waiting = append(v.waiting, winner)
			}
			fates[winner.part].Unchanged++
			i = j
			continue
		}
		switch {
		case winner.part < 0: // what was there stays
		case !known:
			fates[winner.part].New++
			v.fresh = append(v.fresh, winner)
		case !differs:
			fates[winner.part].Unchanged++
			v.moved = append(v.moved, winner)
		default:
			fates[winner.part].Changed++
			v.changed = append(v.changed, winner)
		}
		if known && winner.part >= 0 {
			if old.batch == winner.batch {
				// The earlier row of the batch was counted when it was new; it is
				// now one that is repeated, and the key counts once all the same.
				fates[winner.part].Repeated++
				if old.valueC == winner.valueC && old.quality == winner.quality {
					fates[winner.part].Unchanged--
				} else {
					fates[winner.part].Changed--
				}
			}
			v.lose(old, winner)
		}
		i = j
	}
}

// lose keeps the history of a value that does not count.
func (v *verdict) lose(lost, winner row) {
	if lost.valueC != winner.valueC || lost.quality != winner.quality {
		v.replaced = append(v.replaced, loser{lost, winner})
	}
}
