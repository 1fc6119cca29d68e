package stress

import (
	"testing"

	"drivemend/measure"
)

func BenchmarkEdge(b *testing.B) {
	for _, c := range []struct {
		name, topology string
		board          [][2]string
	}{{"none", "low-side-chopper", pump}, {"rcd", "low-side-chopper", clamped}, {"depletion", "low-side-chopper", depleting},
		{"leg-none", "half-bridge", pump}, {"leg-rcd", "half-bridge", clamped}} {
		p, _ := prepare(boardOf(b, c.board...).WithWord("topology", c.topology).WithParts("low", "Q1", "Q2", "Q3").WithParts("high", "Q4", "Q5", "Q6"))
		for _, g := range []graded{isCut, opens, closes} {
			b.Run(c.name+"/"+g.name+"/"+g.shape, func(b *testing.B) {
				b.ReportAllocs()
				for b.Loop() {
					if _, err := g.in(p.nominal().quick()); err != nil {
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

// The whole margin of one board: a chopper and a bridge.
func BenchmarkCompute(b *testing.B) {
	for _, topology := range []string{"low-side-chopper", "h-bridge"} {
		c := &measure.Case{Board: boardOf(b, clamped...).WithWord("topology", topology).WithParts("low", "Q1", "Q2", "Q3").Without("loop.inductance").Without("switch.rise_slope")}
		b.Run(topology, func(b *testing.B) {
			for b.Loop() {
				if _, err := Compute(c, 1); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// Tolerance samples, as the percentile draws them.
func BenchmarkDraw(b *testing.B) {
	p, _ := prepare(boardOf(b, clamped...).WithParts("low", "Q1", "Q2", "Q3").Without("loop.inductance").Without("switch.rise_slope"))
	const samples = 1000
	for b.Loop() {
		if _, err := p.draw(1, samples); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Microseconds())/float64(b.N)/samples, "µs/sample")
}
