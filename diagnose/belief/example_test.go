package belief_test

import (
	"fmt"

	"drivemend/diagnose/belief"
)

// Two causes of one event, and a finding that speaks for the event.
func Example() {
	m, err := belief.New(
		[]belief.Event{{Leak: 0.01}},
		[]belief.Hypothesis{
			{Weight: 1, Triggers: []belief.Trigger{{Event: 0, P: 0.9}}},
			{Weight: 3},
		})
	if err != nil {
		fmt.Println(err)
		return
	}
	up, joint, err := m.Joint([]belief.Evidence{{Event: 0, Absent: []float64{0.05}, Present: []float64{0.95}}})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("first cause %.3f, event under it %.3f, under the second %.3f\n", up.Posterior[0], joint[0][0], joint[1][0])
	// Output: first cause 0.829, event under it 0.994, under the second 0.161
}
