package knowledge

import "testing"

// BenchmarkLoad loads the embedded base, which every command does first.
func BenchmarkLoad(b *testing.B) {
	for b.Loop() {
		if _, err := Load(); err != nil {
			b.Fatal(err)
		}
	}
}
