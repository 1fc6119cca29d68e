// Package reports is everything that is shown: terminal tables, JSON, Markdown, HTML and figures. It puts finished
// results into words, columns and pages; apart from scaling units it computes nothing.
//
// What comes from a case file is treated as hostile: control characters, markup and over-long text are made harmless
// here, and nowhere else.
package reports

import (
	"time"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

// Report is everything a fault report is written from. Case is needed; any other result may be nil, and the report
// then says that it is missing.
type Report struct {
	Case      *measure.Case
	Base      *knowledge.Base
	At        time.Time // when the report was made; also the moment of Safety
	Ranking   *diagnose.Ranking
	Next      *diagnose.Suggestion
	Margin    *stress.Margin
	Discharge *safety.Plan
	Safety    safety.Status
	Outside   []Outside
	// OutsideSteps are the entries of the record that were done outside their hold points.
	OutsideSteps []OutsideStep
	Record       []safety.RecordStatus // steps that leave no reading, at the moment of the report
	Private      bool                  // leave out owner, technician, serial number, firmware and who did a step or repair
}

// Outside is a reading that was taken outside its hold point.
type Outside struct {
	Observation int // index into the case's observations
	Missing     []safety.Missing
}

// OutsideStep is an entry of the record whose step was done outside its hold point.
type OutsideStep struct {
	Entry   int // index into the case's steps
	Missing []safety.Missing
}

// Style is how a terminal is written to.
type Style struct {
	Width int  // columns; 0 and anything out of 40 to 200 is 80
	Color bool // after IEC 60073: red danger, yellow caution, green normal, blue mandatory; a word always says the same
}

// ShelfCase is one case of a shelf.
type ShelfCase struct {
	File    string
	Case    *measure.Case     // nil when the file could not be read
	Ranking *diagnose.Ranking // nil when not ranked
	Problem string            // why it could not be read or ranked; "" when it could
}

// DemoSummary is what the demonstration ends with.
type DemoSummary struct {
	Folder  string
	Case    *measure.Case
	Ranking *diagnose.Ranking
	Margin  *stress.Margin
	Outside []Outside
	Report  string // path of the report
	Command string // the one next command to try
}
