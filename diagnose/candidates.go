package diagnose

import (
	"drivemend/knowledge"
	"drivemend/measure"
)

// candidates lists every open test, one entry for each place it can be done at.
func (s *state) candidates(c *measure.Case) []Candidate {
	done := s.answered(c)
	var out []Candidate
	for _, t := range s.tests {
		if t.UsedIn == "prior" || t.Computed != "" || t.AnsweredBy != nil && s.keyed(t) {
			continue
		}
		for _, cand := range s.places(t) {
			key := voteKey{test: t.ID}
			key.where, key.at = s.placeOf(t, cand.observation())
			state := done[key]
			if state == answeredDone || key.where == onBank && s.everyPart(done, key) {
				continue
			}
			cand.Test, cand.Minutes, cand.Deferred = t, t.Minutes, state == answeredLater
			cand.Must = t.Must && (!cand.Lifted || s.bankSuspect(t, key.at))
			if cand.Lifted {
				cand.Minutes += liftMinutes
			}
			out = append(out, cand)
		}
	}
	return out
}

// observation is the answer to a candidate as far as its place goes.
func (c *Candidate) observation() measure.Observation {
	ob := measure.Observation{Part: c.Part, Position: c.Position}
	if c.Lifted {
		ob.State = "lifted"
	}
	return ob
}

// everyPart tells whether each part of a bank has been read by itself, so that the bank need not be.
func (s *state) everyPart(done map[voteKey]int, bank voteKey) bool {
	for _, p := range s.parts.banks[bank.at].parts {
		if done[voteKey{bank.test, onPart, p}] != answeredDone {
			return false
		}
	}
	return true
}

// bankSuspect tells whether the bank of a part was read in circuit and the reading spoke for the fault: then every
// parallel part has to be told apart, and the check of each stands.
func (s *state) bankSuspect(t *knowledge.Test, part int) bool {
	for i := range s.votes {
		vt := &s.votes[i]
		if vt.finding.Test == t && vt.where == onBank && vt.at == s.parts.bankOf[part] {
			return vt.present > vt.absent
		}
	}
	return false
}

func (s *state) keyed(t *knowledge.Test) bool {
	word, _, known := s.lookup(t.AnsweredBy.Path)
	_, ok := t.AnsweredBy.Results[word]
	return known && ok
}

// How far the answer to a test at a place has come.
const (
	answeredNot = iota
	answeredLater
	answeredDone
)

// answered marks the places of tests that need not be asked again. An answer put off is asked again after the rest;
// so is a must-do check that was skipped. A test of the whole board that was done at every place of it is done.
func (s *state) answered(c *measure.Case) map[voteKey]int {
	done, current, places := map[voteKey]int{}, counted(c), map[string]int{}
	for i, ob := range c.Observations {
		t := s.test(ob.Test)
		if t == nil || !current[i] {
			continue
		}
		how := answeredDone
		if ob.Answer == "later" || ob.Answer != "" && t.Must {
			how = answeredLater
		}
		key := voteKey{test: ob.Test}
		key.where, key.at = s.placeOf(t, ob)
		if t.Per == "" && key.where != onBoard && done[key] != answeredDone && how == answeredDone {
			places[t.ID]++
			if places[t.ID] >= s.placeCount(key.where) {
				done[voteKey{test: t.ID}] = answeredDone
			}
		}
		done[key] = max(done[key], how)
	}
	return done
}

// places gives where a test can be done: the board; each position; or, for parts, each bank in circuit and each
// part of a bank of two or more by itself.
func (s *state) places(t *knowledge.Test) []Candidate {
	switch t.Per {
	case "position":
		return s.bankPlaces()
	case "part":
		if !atTerminals(t) {
			return s.partPlaces(false)
		}
		return append(s.bankPlaces(), s.partPlaces(true)...)
	}
	return []Candidate{{}}
}

func (s *state) bankPlaces() []Candidate {
	var out []Candidate
	for _, b := range s.parts.banks {
		out = append(out, Candidate{Position: b.position})
	}
	return out
}

func (s *state) partPlaces(lifted bool) []Candidate {
	var out []Candidate
	for i, name := range s.parts.parts {
		if !lifted || len(s.parts.banks[s.parts.bankOf[i]].parts) > 1 {
			out = append(out, Candidate{Part: name, Lifted: lifted})
		}
	}
	return out
}
