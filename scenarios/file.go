package scenarios

import (
	"fmt"
	"reflect"

	"polewright/plants"
)

// The tree of a scenario file as written, before any check of its meaning.

type rawScenario struct {
	Format   *int       `toml:"format"`
	Name     string     `toml:"name"`
	Duration *float64   `toml:"duration_s"`
	Loop     *string    `toml:"loop"`
	Step     *float64   `toml:"step_s"`
	Initial  rawInitial `toml:"initial"`
	Drive    []rawDrive `toml:"drive"`
	Surprise []rawDrive `toml:"surprise"`
	Noise    rawNoise   `toml:"noise"`
	Fault    []rawFault `toml:"fault"`
	Limits   rawLimits  `toml:"limits"`
}

type rawInitial struct {
	True     []float64 `toml:"true"`
	Estimate []float64 `toml:"estimate"`
}

type rawDrive struct {
	Input     string   `toml:"input"`
	Shape     string   `toml:"shape"`
	At        *float64 `toml:"at_s"`
	Until     *float64 `toml:"until_s"`
	Size      *float64 `toml:"size"`
	Frequency *float64 `toml:"frequency_hz"`
	To        *float64 `toml:"to_hz"`
	File      *string  `toml:"file"`
	Column    *string  `toml:"column"`
}

type rawNoise struct {
	Seed    *int     `toml:"seed"`
	Process *float64 `toml:"process"`
	Sensor  *float64 `toml:"sensor"`
}

type rawFault struct {
	Sensor string   `toml:"sensor"`
	Kind   string   `toml:"kind"`
	From   *float64 `toml:"from_s"`
	Until  *float64 `toml:"until_s"`
	Size   *float64 `toml:"size"`
}

type rawLimits struct {
	Settle      *float64           `toml:"settle_s"`
	Peak        *float64           `toml:"peak_max"`
	OverFloor   *float64           `toml:"over_floor_max"`
	Gain        *float64           `toml:"gain_max"`
	Sensitivity *float64           `toml:"sensitivity_max"`
	Phase       *float64           `toml:"phase_margin_deg"`
	Delay       *float64           `toml:"delay_margin_s"`
	Std         map[string]float64 `toml:"std"`
	Error       map[string]float64 `toml:"error"`
	InputStd    map[string]float64 `toml:"input_std"`
}

// rawTruth is the table [truth]: a file name or factors by parameter.
type rawTruth struct {
	plant   *string
	factors map[string]*float64
}

// decode reads a file strictly. The keys of [truth] are the plant's parameters,
// so the type of the tree is made for this plant.
func decode(file string, data []byte, p *plants.Plant) (*rawScenario, rawTruth, error) {
	fixed := reflect.TypeFor[rawScenario]()
	var fields []reflect.StructField
	for i := range fixed.NumField() {
		f := fixed.Field(i)
		fields = append(fields, reflect.StructField{Name: f.Name, Type: f.Type, Tag: f.Tag})
	}
	truth := []reflect.StructField{{Name: "Plant", Type: reflect.TypeFor[*string](), Tag: `toml:"plant"`}}
	var names []string
	for i, q := range p.Parameters {
		if q.Name == "plant" {
			continue // the file name's key
		}
		names = append(names, q.Name)
		truth = append(truth, reflect.StructField{
			Name: fmt.Sprintf("P%d", i), Type: reflect.TypeFor[*float64](),
			Tag: reflect.StructTag(fmt.Sprintf("toml:%q", q.Name)),
		})
	}
	fields = append(fields, reflect.StructField{Name: "Truth", Type: reflect.StructOf(truth), Tag: `toml:"truth"`})
	tree := reflect.New(reflect.StructOf(fields))
	if err := plants.Decode(file, data, tree.Interface()); err != nil {
		return nil, rawTruth{}, err
	}
	raw := new(rawScenario)
	for i := range fixed.NumField() {
		reflect.ValueOf(raw).Elem().Field(i).Set(tree.Elem().Field(i))
	}
	table := tree.Elem().Field(fixed.NumField())
	t := rawTruth{plant: table.Field(0).Interface().(*string), factors: map[string]*float64{}}
	for i, name := range names {
		t.factors[name] = table.Field(i + 1).Interface().(*float64)
	}
	return raw, t, nil
}
