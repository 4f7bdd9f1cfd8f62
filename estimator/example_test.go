package estimator_test

import (
	"context"
	"fmt"
	"log"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// An oscillator whose position is measured: place the estimator's poles and compare its
// noise with the best that any linear estimator could do.
func ExampleDesigner_Place() {
	d, err := estimator.NewDesigner(&estimator.Model{
		A: mat.NewDense(2, 2, []float64{0, 1, -4, -0.4}),
		C: mat.NewDense(1, 2, []float64{1, 0}),
		Q: mat.NewSymDense(2, []float64{0, 0, 0, 1}),
		R: mat.NewSymDense(1, []float64{0.01}),
	}, estimator.Options{})
	if err != nil {
		log.Fatal(err)
	}
	design, err := d.Place([]complex128{-4 + 3i, -4 - 3i}, nil)
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("gain %.2f, %.2f\n", design.Gain.At(0, 0), design.Gain.At(1, 0))
	fmt.Printf("noise %.3f times the floor's\n", design.Noise.OverFloorRMS)
	fmt.Printf("settles in %.2f s, peaks at %.2f\n", design.Transient.Settle, design.Transient.Peak)
	// Output:
	// gain 7.60, 17.96
	// noise 1.182 times the floor's
	// settles in 1.47 s, peaks at 1.98
}

// While a pole is dragged each design starts from the last one, and only the figures
// that change under the hand are computed; the rest follows when the hand rests.
func ExampleDesigner_QuickPlace() {
	d, err := estimator.NewDesigner(&estimator.Model{
		A: mat.NewDense(3, 3, []float64{0, 1, 0, -4, -0.4, 1, 0, 0, -0.1}),
		C: mat.NewDense(2, 3, []float64{1, 0, 0, 0, 0, 1}),
		Q: mat.NewSymDense(3, []float64{0, 0, 0, 0, 1, 0, 0, 0, 1}),
		R: mat.NewSymDense(2, []float64{0.01, 0, 0, 0.01}),
	}, estimator.Options{Method: estimator.LeastNoise})
	if err != nil {
		log.Fatal(err)
	}
	var design *estimator.Design
	for x := -3.0; x >= -5; x -= 0.5 {
		if design, err = d.QuickPlace([]complex128{-4 + 3i, -4 - 3i, complex(x, 0)}, design); err != nil {
			log.Fatal(err)
		}
		fmt.Printf("pole at %.1f: noise %.3f times the floor's\n", x, design.Noise.OverFloorRMS)
	}
	if design, err = d.Complete(context.Background(), design); err != nil {
		log.Fatal(err)
	}
	fmt.Println("sets of lost sensors looked at:", len(design.SensorSets))
	// Output:
	// pole at -3.0: noise 1.099 times the floor's
	// pole at -3.5: noise 1.093 times the floor's
	// pole at -4.0: noise 1.091 times the floor's
	// pole at -4.5: noise 1.091 times the floor's
	// pole at -5.0: noise 1.092 times the floor's
	// sets of lost sensors looked at: 3
}
