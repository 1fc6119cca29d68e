package main

import (
	"encoding/binary"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/reports"
)

// mostInput bounds what is read from standard input, as a case file is bounded on disk.
const mostInput = 1<<20 + 1

// load reads a case file; "-" is standard input. A name without an ending may leave out .yaml.
func (a *app) load(path string) (*measure.File, error) {
	if path == "-" {
		raw, err := io.ReadAll(io.LimitReader(a.in, mostInput))
		if err != nil {
			return nil, wrongInput("standard input cannot be read: " + err.Error())
		}
		return measure.Parse("standard input", raw)
	}
	path = onDisk(path)
	f, err := measure.Load(path)
	if err != nil && errors.Is(err, fs.ErrNotExist) {
		if gone := folderGone(path); gone != nil {
			return nil, gone
		}
		return nil, wrongInput(path+": there is no such case here", "start it: drivemend new "+quoted(path), "or look at what is here: drivemend cases "+quoted(folderOf(path)))
	}
	return f, err
}

// loadToChange reads a case file that a command will write to.
func (a *app) loadToChange(path string) (*measure.File, error) {
	if path == "-" {
		return nil, wrongCommand("standard input cannot be written to", "name the case file")
	}
	return a.load(path)
}

// onDisk gives the file that a name means: the file itself, or with .yaml behind it when that was left out.
func onDisk(path string) string {
	if _, err := os.Stat(path); err == nil || isCaseName(path) {
		return path
	}
	return path + ".yaml"
}

// isCaseName tells whether a name ends as case files do.
func isCaseName(path string) bool {
	ext := strings.ToLower(filepath.Ext(path))
	return ext == ".yaml" || ext == ".yml"
}

func folderOf(path string) string { return filepath.Dir(path) }

// folderGone tells of a path whose folder is not there, or not there any more: a case in it cannot be started, only
// lost. nil when the folder is there.
func folderGone(path string) error {
	if !filepath.IsAbs(path) {
		if _, err := os.Getwd(); err != nil {
			return wrongInput(path+": the folder you are in is gone: it was moved or deleted meanwhile", "go to the folder that holds the case, or name it with its whole path; nothing was changed")
		}
	}
	if _, err := os.Stat(folderOf(path)); err != nil {
		return wrongInput(path+": there is no folder "+folderOf(path), "make the folder first, or name another place")
	}
	return nil
}

// chain is the pure way from one case to its results. It is run anew after every answer.
type chain struct {
	base  *knowledge.Base
	kept  *diagnose.Compiled // the base made ready for this board
	c     *measure.Case
	spans map[string]stress.Span
	needs []stress.Need
}

// chainOf works out the figures of the board, which the ranking and the next test read.
func chainOf(base *knowledge.Base, c *measure.Case) (*chain, error) {
	spans, needs, err := stress.Spans(c.Board)
	if err != nil {
		return nil, err
	}
	return &chain{base, diagnose.For(base), c, spans, needs}, nil
}

// following is the chain of a case's next state: the base stays ready while the board does not change.
func (k *chain) following(c *measure.Case) (*chain, error) {
	next, err := chainOf(k.base, c)
	if err == nil {
		next.kept = k.kept
	}
	return next, err
}

// chain loads the base and a case and gives their chain.
func (a *app) chain(path string) (*chain, error) {
	f, err := a.load(path)
	if err != nil {
		return nil, err
	}
	base, err := a.base()
	if err != nil {
		return nil, err
	}
	return chainOf(base, f.Case)
}

func (k *chain) rank(about string) (*diagnose.Ranking, error) {
	return k.kept.Rank(k.c, k.spans, about)
}

func (k *chain) next(at time.Time) (*diagnose.Suggestion, error) {
	return k.kept.Next(k.c, k.spans, at)
}

// margin works out the edges; the draws are seeded by the rule base.
func (k *chain) margin() (*stress.Margin, error) {
	seed, err := seedOf(k.base)
	if err != nil {
		return nil, err
	}
	return stress.Compute(k.c, seed)
}

// seedOf is the first eight bytes of the rule base's hash.
func seedOf(base *knowledge.Base) (uint64, error) {
	raw, err := hex.DecodeString(base.Hash)
	if err != nil || len(raw) < 8 {
		return 0, fmt.Errorf("the rule base has no hash to seed draws from")
	}
	return binary.BigEndian.Uint64(raw), nil
}

// discharge is the plan for the board with what its stores were read at last.
func (k *chain) discharge(at time.Time) (*safety.Plan, error) {
	return safety.Discharge(safety.InputAt(k.c, at))
}

// beside is what a screen shows beside its result: what was read outside its hold point, the leading cause, the safety
// state at a moment.
func (k *chain) beside(r *diagnose.Ranking, at time.Time) reports.Beside {
	e := k.evidence()
	status := safety.StatusOf(k.c, at, e)
	return reports.Beside{Ranking: r, Safety: &status, Outside: k.outside(), Case: k.c, Record: safety.Record(k.c, at, e)}
}

func (k *chain) evidence() safety.Evidence { return diagnose.EvidenceOf(k.base, k.c) }

// check tells whether an instruction of a need may be given at a moment.
func (k *chain) check(need safety.Need, at time.Time) safety.Decision {
	return safety.Check(k.c, safety.Work{Need: need}, at, k.evidence())
}

// outside lists the readings that were taken outside their hold points. Those of unknown tests are left out: nothing
// tells what they needed.
func (k *chain) outside() []reports.Outside {
	var out []reports.Outside
	for i, o := range k.c.Observations {
		if missing := k.missedAt(o); len(missing) > 0 {
			out = append(out, reports.Outside{Observation: i, Missing: missing})
		}
	}
	return out
}

// missedAt tells what was missing when a reading was taken, from the record as it stood then.
func (k *chain) missedAt(o measure.Observation) []safety.Missing {
	t := k.base.Test(o.Test)
	if t == nil {
		return nil
	}
	_, missing := safety.OutsideHoldPoint(k.c, o, diagnose.WorkOf(t), diagnose.EvidenceOf(k.base, safety.AsOf(k.c, o.At)))
	return missing
}

// outsideSteps lists the steps of the record that were done outside their hold points, each from the record as it stood
// then.
func (k *chain) outsideSteps() []reports.OutsideStep {
	var out []reports.OutsideStep
	for i, s := range k.c.Steps {
		if missing := safety.OutsideStep(k.c, i, diagnose.EvidenceOf(k.base, safety.AsOf(k.c, s.At))); len(missing) > 0 {
			out = append(out, reports.OutsideStep{Entry: i, Missing: missing})
		}
	}
	return out
}

// report gathers everything a fault report is written from.
func (k *chain) report(at time.Time) (reports.Report, error) {
	r := reports.Report{Case: k.c, Base: k.base, At: at, Outside: k.outside(), OutsideSteps: k.outsideSteps()}
	var err error
	if r.Ranking, err = k.rank(""); err != nil {
		return r, err
	}
	if r.Next, err = k.next(at); err != nil {
		return r, err
	}
	if r.Margin, err = k.margin(); err != nil {
		return r, err
	}
	if r.Discharge, err = k.discharge(at); err != nil {
		return r, err
	}
	r.Safety, r.Record = safety.StatusOf(k.c, at, k.evidence()), safety.Record(k.c, at, k.evidence())
	return r, nil
}

// caseID makes a case id of a file name.
func caseID(path string) string {
	name := strings.TrimSuffix(filepath.Base(path), filepath.Ext(path))
	return strings.Map(func(r rune) rune {
		if r == ' ' || r == '\t' {
			return '-'
		}
		return r
	}, name)
}
