package ripple

import "fmt"

func ExampleStage() {
	s := Stage{Bus: 1000, Duty: 0.4, Choke: 0.4e-3, Switching: 4000, Phases: 3}
	fmt.Printf("one choke %.0f, all three %.1f\n", s.PhaseSwing(), s.SumSwing())
	// Output: one choke 150 A, all three 33.3 A
}
