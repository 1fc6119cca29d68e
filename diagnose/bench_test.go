package diagnose

import (
	"testing"
	"time"

	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

func fullCase(b *testing.B) (*knowledge.Base, *measure.Case, map[string]stress.Span) {
	b.Helper()
	base, err := knowledge.Load()
	if err != nil {
		b.Fatal(err)
	}
	f, err := measure.Load("../testdata/full-case.yaml")
	if err != nil {
		b.Fatal(err)
	}
	spans, _, err := stress.Spans(f.Case.Board)
	if err != nil {
		b.Fatal(err)
	}
	return base, f.Case, spans
}

func BenchmarkRank(b *testing.B) {
	base, c, spans := fullCase(b)
	for b.Loop() {
		if _, err := Rank(base, c, spans, ""); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkRankInSession ranks as a session does, which keeps the base compiled for its board between answers.
func BenchmarkRankInSession(b *testing.B) {
	base, c, spans := fullCase(b)
	kept := For(base)
	for b.Loop() {
		if _, err := kept.Rank(c, spans, ""); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkNext(b *testing.B) {
	base, c, spans := fullCase(b)
	now := time.Date(2026, 12, 1, 12, 0, 0, 0, time.UTC)
	for b.Loop() {
		if _, err := Next(base, c, spans, now); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkSpans(b *testing.B) {
	_, c, _ := fullCase(b)
	for b.Loop() {
		if _, _, err := stress.Spans(c.Board); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkLoadBase(b *testing.B) {
	for b.Loop() {
		if _, err := knowledge.Load(); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkEvidenceOf reads the evidence of the hold points out of the full case with every static reading taken.
func BenchmarkEvidenceOf(b *testing.B) {
	base, c, _ := fullCase(b)
	c = withStatics(base, c)
	for b.Loop() {
		EvidenceOf(base, c)
	}
}
