package placement

import "math"

// A warm descent may turn the eigenvectors by restless + follow times the relative
// movement of the poles, in radians. So the gain stays continuous where the valley
// that it follows ends: the fall into the next one is spread over several calls.
const (
	restless = 1e-3
	follow   = 4.0
)

// worstCondition is where eigenvectors count as dependent.
const worstCondition = 1e10

// choose finds the eigenvectors. It reports false where no independent ones were
// found.
func (r *robust) choose(warm *Warm) (Info, bool) {
	r.nullSpaces()
	r.start = grow(r.start, len(r.frames))
	moved := warm.moved(r.groups)
	if ok, carried := warm.project(r); ok {
		rule := nearby
		rule.travel = restless + follow*moved
		f, steps, done := r.descend(rule, carried)
		if f < math.Log(worstCondition) {
			return Info{Condition: r.condition(), Iterations: steps, Converged: done}, true
		}
	}
	if !warm.Empty() {
		r.nullSpaces()
	}
	return r.cold()
}

// starts is the number of cold starts: fewer where each is dear.
func (r *robust) starts() int {
	if r.n > 12 {
		return 3
	}
	return 4
}

// How far the descents go: from a start to the right valley, down that valley, and
// from an earlier choice.
var (
	rough  = stopping{squarings: powerRough, steps: 30, gradient: 1e-2, drop: 1e-2}
	fine   = stopping{squarings: powerFine, steps: 200, gradient: 1e-6, drop: 1e-5}
	nearby = stopping{squarings: powerFine, steps: 60, gradient: 1e-6, drop: 1e-9}
)

// cold descends from several starts on the rough measure, then polishes the best.
func (r *robust) cold() (Info, bool) {
	info := Info{}
	best := math.Inf(1)
	seed := uint64(1)
	r.basis = append(r.basis[:0], r.frames...)
	for range r.starts() {
		copy(r.frames, r.basis)
		r.scatter(&seed)
		_, steps, _ := r.descend(rough, false)
		info.Iterations += steps
		if f := r.measure(powerFine); f < best {
			best = f
			copy(r.start, r.frames)
		}
		if r.free == 0 {
			break
		}
	}
	if math.IsInf(best, 1) {
		return info, false
	}
	copy(r.frames, r.start)
	rule := fine
	if r.n > 8 {
		rule.drop = 1e-4
	}
	f, steps, done := r.descend(rule, false)
	info.Iterations += steps
	info.Converged = done
	info.Condition = r.condition()
	return info, f < math.Log(worstCondition)
}

// scatter mixes each frame by random numbers.
func (r *robust) scatter(seed *uint64) {
	n, p := r.n, r.p
	r.descent.reset(r.free, len(r.frames))
	old := r.descent.saved
	copy(old, r.frames)
	for i := range r.groups {
		g := &r.groups[i]
		from := old[i*n*p : (i+1)*n*p]
		clear(g.t)
		for j := range p {
			for l := range p {
				y := complex(draw(seed), 0)
				if g.pair {
					y += complex(0, draw(seed))
				}
				for k, v := range from[l*n : l*n+n] {
					g.t[j*n+k] += y * v
				}
			}
		}
		if !orthonormalise(g.t, n) {
			copy(g.t, from)
		}
	}
}

// condition returns the 2-norm condition number of the present eigenvectors, by
// one-sided Jacobi rotations of the rows of Xᵀ (Hestenes 1958; Demmel & Veselić 1992).
func (r *robust) condition() float64 {
	n := r.n
	r.fillX()
	x := r.lu
	copy(x, r.xt)
	for range 30 {
		worst := 0.0
		for i := 1; i < n; i++ {
			u := x[i*n : i*n+n]
			for j := range i {
				v := x[j*n : j*n+n]
				uu, vv, uv := dot(u, u), dot(v, v), dot(u, v)
				if uv == 0 {
					continue
				}
				worst = math.Max(worst, math.Abs(uv)/math.Sqrt(uu*vv))
				zeta := (vv - uu) / (2 * uv)
				t := math.Copysign(1, zeta) / (math.Abs(zeta) + math.Hypot(1, zeta))
				c := 1 / math.Hypot(1, t)
				s := c * t
				for k, a := range u {
					b := v[k]
					u[k], v[k] = c*a-s*b, s*a+c*b
				}
			}
		}
		if worst < 1e-12 {
			break
		}
	}
	most, least := 0.0, math.Inf(1)
	for i := range n {
		size := norm2(x[i*n : i*n+n])
		most, least = math.Max(most, size), math.Min(least, size)
	}
	return most / least
}

// draw returns a number from −1 to 1 by Knuth's 64-bit linear congruential generator
// (MMIX), so that every run takes the same starts.
func draw(seed *uint64) float64 {
	*seed = *seed*6364136223846793005 + 1442695040888963407
	return float64(*seed>>11)/(1<<52) - 1
}
