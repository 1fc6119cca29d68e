package circuit

// Steps tells how many steps the run has tried so far: its work, the same on every machine.
func (r *Run) Steps() int { return r.steps }
