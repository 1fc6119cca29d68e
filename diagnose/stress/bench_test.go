package stress

import (
	"testing"

	"drivemend/measure"
)

func BenchmarkEdge(b *testing.B) {
	for _, c := range []struct {
		name  string
		board [][2]string
	}{{"none", pump}, {"rcd", clamped}, {"depletion", depleting}} {
		p, _ := prepare(boardOf(b, c.board...).WithParts("low", "Q1", "Q2", "Q3"))
		for name, shape := range map[string]edgeShape{shapeCut: scene.cut, shapeGate: scene.gateLimited} {
			b.Run(c.name+"/"+name, func(b *testing.B) {
				for b.Loop() {
					if _, err := shape(p.nominal().quick()); err != nil {
						b.Fatal(err)
					}
				}
			})
		}
	}
}

func BenchmarkSpans(b *testing.B) {
	board := boardOf(b, clamped...).WithParts("low", "Q1", "Q2", "Q3").Without("loop.inductance").Without("switch.rise_slope")
	for b.Loop() {
		if _, _, err := Spans(board); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkCompute(b *testing.B) {
	c := &measure.Case{Board: boardOf(b, clamped...).WithParts("low", "Q1", "Q2", "Q3").Without("loop.inductance").Without("switch.rise_slope")}
	for b.Loop() {
		if _, err := Compute(c, 1); err != nil {
			b.Fatal(err)
		}
	}
}
