package knowledge

import (
	"fmt"
	"strings"
	"testing"
	"testing/fstest"

	"pgregory.net/rapid"
)

// TestParentsStandFirst draws links along a hidden order, writes the events in another one, and expects parents
// before children whatever the files look like.
func TestParentsStandFirst(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(2, 12).Draw(t, "events")
		names := make([]int, n)
		for i := range names {
			names[i] = i
		}
		hidden := rapid.Permutation(names).Draw(t, "hidden order")
		rank := make([]int, n)
		for i, e := range hidden {
			rank[e] = i
		}
		var text strings.Builder
		for e := range n {
			var links []string
			for to := range n {
				if rank[to] > rank[e] && rapid.Bool().Draw(t, "link") {
					links = append(links, fmt.Sprintf("e%d: 0.5", to))
				}
			}
			fmt.Fprintf(&text, "- {id: e%d, leak: 0.1, leads_to: {%s}}\n", e, strings.Join(links, ", "))
		}
		base, err := LoadFS(fstest.MapFS{
			"faults.yaml":  {Data: []byte(text.String())},
			"causes.yaml":  {Data: []byte("- {id: c, role: trigger, share: {dc: 1, mains: 1, repeat: 1}, leads_to: {e0: 1}, repair: r}")},
			"repairs.yaml": {Data: []byte("- {id: r, title: Mend, minutes: 1}")},
		})
		if err != nil {
			t.Fatal(err)
		}
		if len(base.Events) != n {
			t.Fatalf("%d events of %d", len(base.Events), n)
		}
		placed := map[string]int{}
		for i, e := range base.Events {
			placed[e.ID] = i
		}
		for i, e := range base.Events {
			for _, l := range e.LeadsTo {
				if placed[l.To] <= i {
					t.Fatalf("%s leads to %s, which stands before it", e.ID, l.To)
				}
			}
		}
	})
}
