package plants_test

import (
	"fmt"

	"polewright/plants"
)

func ExampleParse() {
	p, err := plants.Parse("cart.toml", []byte(`
format = 1
[parameters]
mass = { value = 2.0, unit = "kg" }
[model]
time = "continuous"
A = [[0, 1], [0, 0]]
B = [[0], ["1/mass"]]
C = [[1, 0]]
[[sensors]]
name = "tape"
noise_density = 1e-6
lag_s = 0.1
`))
	if err != nil {
		fmt.Println(err)
		return
	}
	m, err := p.Model(plants.Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(m.StateNames)
	fmt.Println(m.A.RawRowView(2))
	// Output:
	// [x1 x2 tape lag]
	// [10 0 -10]
}

func ExampleError() {
	_, err := plants.Parse("cart.toml", []byte("format = 1\n[model]\ntime = \"continuous\"\nA = [[0, 1]]\nC = [[1]]"))
	fmt.Println(err)
	// Output:
	// cart.toml: model, A: 1×2; expected 1×1 (square)
}
