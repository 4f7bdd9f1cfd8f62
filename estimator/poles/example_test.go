package poles_test

import (
	"fmt"

	"polewright/estimator/poles"
)

func ExampleParse() {
	spec, err := poles.Parse("-4±3i, -6, -8x2")
	fmt.Println(spec.Poles, err)
	_, err = poles.Parse("-4+3i, -6")
	fmt.Println(err)
	// Output:
	// [(-4+3i) (-4-3i) (-6+0i) (-8+0i) (-8+0i)] <nil>
	// pole -4+3i: its conjugate is missing; expected the pair -4±3i
}

func ExampleFormatList() {
	fmt.Println(poles.FormatList([]complex128{-8, -4 - 3i, -8, -4 + 3i}))
	// Output: -8x2, -4±3i
}

func ExampleFaster() {
	fast, _ := poles.Faster([]complex128{-1, 0.5}, 4) // the unstable pole is mirrored
	fmt.Println(poles.FormatList(fast))
	// Output: -4, -2
}

func ExampleDescribe() {
	d := poles.Describe(-3+4i, 0)
	fmt.Printf("%g rad/s, damping %g, time constant %.3f s\n", d.Frequency, d.Damping, d.TimeConstant)
	// Output: 5 rad/s, damping 0.6, time constant 0.333 s
}

func ExampleMatch() {
	fmt.Println(poles.Match([]complex128{-1, -2}, []complex128{-2.1, -0.9}))
	// Output: [1 0]
}
