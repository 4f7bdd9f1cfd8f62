package scenarios

import (
	"bufio"
	"errors"
	"io"
	"math"
	"strconv"
	"strings"

	"polewright/plants"
)

// WriteCSV writes a run as CSV (RFC 4180, lines ending in LF) with a header:
// t, "true <state>" per state of the plant, the further states of a fuller plant
// likewise, one column per state estimate under its own name, "<sensor>
// innovation". Values read back exactly; what is not defined is an empty field.
func WriteCSV(w io.Writer, run *Run, p *plants.Plant) error {
	if run == nil || p == nil || len(run.True) != len(p.States) {
		return errors.New("there is no run of this plant to write")
	}
	out := bufio.NewWriterSize(w, 1<<16)
	header := []string{"t"}
	columns := [][]float64{run.T}
	add := func(before string, names []string, after string, lists [][]float64) {
		for i, list := range lists {
			header = append(header, before+names[i]+after)
			columns = append(columns, list)
		}
	}
	add("true ", run.StateNames, "", run.True)
	add("true ", run.OtherNames, "", run.Others)
	add("", run.EstimateNames, "", run.Estimate)
	add("", run.SensorNames, " innovation", run.Innovations)
	for i, h := range header {
		header[i] = field(h)
	}
	out.WriteString(strings.Join(header, ","))
	out.WriteByte('\n')
	var line []byte
	for k := range run.T {
		line = line[:0]
		for i, c := range columns {
			if i > 0 {
				line = append(line, ',')
			}
			if v := c[k]; !math.IsNaN(v) && !math.IsInf(v, 0) {
				line = strconv.AppendFloat(line, v, 'g', -1, 64)
			}
		}
		line = append(line, '\n')
		if _, err := out.Write(line); err != nil {
			return err
		}
	}
	return out.Flush()
}

// field quotes a name where it needs quotes.
func field(s string) string {
	if strings.ContainsAny(s, ",\"\r\n") || strings.TrimSpace(s) != s {
		return `"` + strings.ReplaceAll(s, `"`, `""`) + `"`
	}
	return s
}
