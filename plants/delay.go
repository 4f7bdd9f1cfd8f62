package plants

import (
	"fmt"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// delay appends the shift registers of whole-sample delays, first the inputs',
// then the sensors'. Register 1 takes the newest value, the last one feeds the
// plant or stands for the sensor. No noise enters them.
func (b *assembly) delay() {
	first := len(b.names)
	inputs := map[int]int{}
	for j, u := range b.p.Inputs {
		if u.DelaySamples > 0 {
			inputs[j] = b.addRegisters(u.Name, u.Scale, u.DelaySamples)
		}
	}
	sensors := map[int]int{}
	for row, i := range b.used {
		if s := b.p.Sensors[i]; s.DelaySamples > 0 {
			sensors[row] = b.addRegisters(s.Name, s.Scale, s.DelaySamples)
		}
	}
	total := len(b.names)
	if total == first {
		return
	}
	b.a, b.c, b.g = grown(b.a, total, total), grown(b.c, len(b.used), total), growRows(b.g, total)
	if b.b != nil {
		b.b = growRows(b.b, total)
	}
	for j, head := range inputs {
		last := head + b.p.Inputs[j].DelaySamples - 1
		for k := range first {
			b.a.Set(k, last, b.b.At(k, j))
			b.b.Set(k, j, 0)
		}
		for row := range b.used {
			b.c.Set(row, last, b.d.At(row, j))
			b.d.Set(row, j, 0)
		}
		b.b.Set(head, j, 1)
		b.shift(head, last)
	}
	for row, head := range sensors {
		last := head + b.p.Sensors[b.used[row]].DelaySamples - 1
		for k := range total {
			b.a.Set(head, k, b.c.At(row, k))
			b.c.Set(row, k, 0)
		}
		if b.b != nil {
			_, m := b.b.Dims()
			for j := range m {
				b.b.Set(head, j, b.d.At(row, j))
				b.d.Set(row, j, 0)
			}
		}
		b.c.Set(row, last, 1)
		b.shift(head, last)
	}
	if b.sampled() {
		// The identity and the full covariance of a sampled plant go on over
		// the registers.
		b.g = identity(total)
		q := mat.NewSymDense(total, nil)
		for i := range first {
			for j := i; j < first; j++ {
				q.SetSym(i, j, b.q.At(i, j))
			}
		}
		b.q = q
	}
}

// sampled reports a continuous plant that was brought to discrete time.
func (b *assembly) sampled() bool { return b.p.Continuous && b.discrete }

func (b *assembly) addRegisters(name string, scale float64, count int) (head int) {
	head = len(b.names)
	for k := range count {
		b.add(fmt.Sprintf("%s delay %d", name, k+1), scale, estimator.DelayRegister)
	}
	return head
}

func (b *assembly) shift(head, last int) {
	for k := head + 1; k <= last; k++ {
		b.a.Set(k, k-1, 1)
	}
}

func growRows(m *mat.Dense, rows int) *mat.Dense {
	_, c := m.Dims()
	return grown(m, rows, c)
}

// grown copies m into the upper left corner of a zero matrix.
func grown(m *mat.Dense, rows, cols int) *mat.Dense {
	r, c := m.Dims()
	big := mat.NewDense(rows, cols, nil)
	big.Slice(0, r, 0, c).(*mat.Dense).Copy(m)
	return big
}
