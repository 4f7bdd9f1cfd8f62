package plants

// The tree of a plant file as written, before any check of its meaning.

type rawPlant struct {
	Format     *int                    `toml:"format"`
	Name       string                  `toml:"name"`
	Note       string                  `toml:"note"`
	Parameters map[string]rawParameter `toml:"parameters"`
	Model      *rawModel               `toml:"model"`
	Operating  rawOperating            `toml:"operating_point"`
	States     []rawState              `toml:"states"`
	Inputs     []rawInput              `toml:"inputs"`
	Sensors    []rawSensor             `toml:"sensors"`
	Outputs    []rawOutput             `toml:"outputs"`
	Process    rawProcess              `toml:"process_noise"`
	Sensor     rawSensorNoise          `toml:"sensor_noise"`
	Feedback   *rawFeedback            `toml:"feedback"`
	Unknowns   []rawUnknown            `toml:"unknowns"`
}

type rawParameter struct {
	Value     *float64 `toml:"value"`
	Unit      string   `toml:"unit"`
	Tolerance float64  `toml:"tolerance"`
}

type rawModel struct {
	Time   string    `toml:"time"`
	Period *float64  `toml:"period_s"`
	A      [][]entry `toml:"A"`
	B      [][]entry `toml:"B"`
	C      [][]entry `toml:"C"`
	D      [][]entry `toml:"D"`
	G      [][]entry `toml:"G"`
}

type rawOperating struct {
	States  []float64 `toml:"states"`
	Inputs  []float64 `toml:"inputs"`
	Sensors []float64 `toml:"sensors"`
}

type rawState struct {
	Name  *string  `toml:"name"`
	Unit  string   `toml:"unit"`
	Scale *float64 `toml:"scale"`
}

type rawInput struct {
	Name       *string   `toml:"name"`
	Unit       string    `toml:"unit"`
	Scale      *float64  `toml:"scale"`
	Delay      int       `toml:"delay_samples"`
	Lag        float64   `toml:"lag_s"`
	Resolution float64   `toml:"resolution"`
	Range      []float64 `toml:"range"`
}

type rawSensor struct {
	Name         *string   `toml:"name"`
	Unit         string    `toml:"unit"`
	Scale        *float64  `toml:"scale"`
	NoiseStd     *float64  `toml:"noise_std"`
	NoiseDensity *float64  `toml:"noise_density"`
	Resolution   float64   `toml:"resolution"`
	Includes     bool      `toml:"noise_includes_resolution"`
	Range        []float64 `toml:"range"`
	Wrap         float64   `toml:"wrap"`
	Delay        int       `toml:"delay_samples"`
	Lag          float64   `toml:"lag_s"`
	Enabled      *bool     `toml:"enabled"`
}

type rawOutput struct {
	Name string  `toml:"name"`
	Unit string  `toml:"unit"`
	Row  []entry `toml:"row"`
}

type rawProcess struct {
	Density    []float64 `toml:"density"`
	Std        []float64 `toml:"std"`
	Covariance [][]entry `toml:"covariance"`
}

type rawSensorNoise struct {
	Covariance [][]entry `toml:"covariance"`
}

type rawFeedback struct {
	K      [][]entry `toml:"K"`
	Cancel []string  `toml:"cancel"`
}

type rawUnknown struct {
	Kind      string   `toml:"kind"`
	On        string   `toml:"on"`
	Drift     *float64 `toml:"drift"`
	Scale     *float64 `toml:"scale"`
	Frequency *float64 `toml:"frequency_hz"`
}
