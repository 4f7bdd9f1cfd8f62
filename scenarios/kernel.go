package scenarios

// packed is a matrix for short products in the inner loop: its rows lie in
// bands of four (the last one of what is left), column after column within a
// band, so that four sums grow side by side.
type packed struct {
	rows, cols int
	a          []float64
}

// pack copies f into p, in p's own memory where that suffices.
func (p *packed) pack(f flat) {
	p.rows, p.cols = f.rows, f.cols
	if cap(p.a) < len(f.a) {
		p.a = make([]float64, len(f.a))
	}
	p.a = p.a[:len(f.a)]
	at := 0
	for i := 0; i < f.rows; i += 4 {
		for j := range f.cols {
			for k := i; k < min(i+4, f.rows); k++ {
				p.a[at] = f.at(k, j)
				at++
			}
		}
	}
}

// mulAdd writes add + p·v into dst. Each sum goes from the first column to the
// last and products are rounded on their own, so that a run is the same on every
// machine.
func (p *packed) mulAdd(dst, v, add []float64) {
	v = v[:p.cols]
	dst, add = dst[:p.rows], add[:p.rows]
	a := p.a
	for len(dst) >= 4 {
		s0, s1, s2, s3 := add[0], add[1], add[2], add[3]
		rest := v
		for len(rest) >= 2 {
			c, x, y := (*[8]float64)(a), rest[0], rest[1]
			s0 += float64(c[0] * x)
			s1 += float64(c[1] * x)
			s2 += float64(c[2] * x)
			s3 += float64(c[3] * x)
			s0 += float64(c[4] * y)
			s1 += float64(c[5] * y)
			s2 += float64(c[6] * y)
			s3 += float64(c[7] * y)
			a, rest = a[8:], rest[2:]
		}
		if len(rest) == 1 {
			c, x := (*[4]float64)(a), rest[0]
			s0 += float64(c[0] * x)
			s1 += float64(c[1] * x)
			s2 += float64(c[2] * x)
			s3 += float64(c[3] * x)
			a = a[4:]
		}
		dst[0], dst[1], dst[2], dst[3] = s0, s1, s2, s3
		dst, add = dst[4:], add[4:]
	}
	switch len(dst) {
	case 3:
		s0, s1, s2 := add[0], add[1], add[2]
		for _, x := range v {
			c := (*[3]float64)(a)
			s0 += float64(c[0] * x)
			s1 += float64(c[1] * x)
			s2 += float64(c[2] * x)
			a = a[3:]
		}
		dst[0], dst[1], dst[2] = s0, s1, s2
	case 2:
		s0, s1 := add[0], add[1]
		for _, x := range v {
			c := (*[2]float64)(a)
			s0 += float64(c[0] * x)
			s1 += float64(c[1] * x)
			a = a[2:]
		}
		dst[0], dst[1] = s0, s1
	case 1:
		s := add[0]
		for j, x := range v {
			s += float64(a[j] * x)
		}
		dst[0] = s
	}
}
