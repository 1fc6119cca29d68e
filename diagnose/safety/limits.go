package safety

// Limit is one source's threshold for one hazard, held against this board. Where sources differ each stands by itself.
type Limit struct {
	Hazard    string // "touch", "shock", "stored energy", "residual charge", "burn", "arc flash", "noise"
	Threshold string // "50 V", "100 V and 10 J"
	Answers   string // the question it answers: "when parts must be de-energised before work, US"
	Source    string
	Read      Grade
	Board     string // this board's figures held against it: "bus 390 V, 200.8 J at +20 %"
	Above     bool   // this board is at or above it
	Lowest    bool   // the lowest for its hazard, and so the one this program goes by
}

// limits holds the thresholds of every source against the stores of a board.
func limits(h hazard) []Limit { return nil }
