package kernel

import (
	"math"
	"math/bits"
)

// Lanes is the number of generators a Stream runs side by side.
const Lanes = 8

// Stream is eight interleaved xoshiro256++ generators (D. Blackman and S. Vigna,
// Scrambled linear pseudorandom number generators, ACM Trans. Math. Softw. 47
// (2021) 36), element i of a row coming from lane i modulo 8. It is plain data:
// copying it saves the state.
type Stream struct {
	state [4][Lanes]uint64
}

// NewStream returns the stream with the given seed and number. The 32 words of
// state come from the SplitMix64 sequence (G. Steele, D. Lea and C. Flood,
// OOPSLA 2014) started at a mixture of both, so that distinct (seed, number)
// give unrelated streams.
func NewStream(seed, number uint64) Stream {
	s := seed
	s = splitMix(&s) ^ number*0xd1342543de82ef95
	s = splitMix(&s) + number
	var r Stream
	for lane := range Lanes {
		for i := range r.state {
			r.state[i][lane] = splitMix(&s)
		}
	}
	return r
}

func splitMix(s *uint64) uint64 {
	*s += 0x9e3779b97f4a7c15
	z := *s
	z = (z ^ z>>30) * 0xbf58476d1ce4e5b9
	z = (z ^ z>>27) * 0x94d049bb133111eb
	return z ^ z>>31
}

// Random draws rows of variates from streams. The zero value is not usable.
type Random struct{ table *vectorOps }

// NewRandom returns the fastest generator kernels the processor has.
func NewRandom() Random { return Random{fastest()} }

// Normals fills z, of a length that is a multiple of 32, with independent
// standard normal variates: Box and Muller (Ann. Math. Statist. 29 (1958) 610) on
// pairs of uniforms of 52 bits, the two variates of a pair half a row apart. The
// largest modulus is 8.49, beyond which the normal law has mass 2e-17.
func (r Random) Normals(s *Stream, z []float64) {
	h := len(z) / 2
	r.table.uniforms(&s.state, z[:h:h], z[h:])
	r.table.boxer(z[:h:h], z[h:])
}

// Uniforms fills u, of a length that is a multiple of 32, with independent
// variates: the first half in (0, 1], the second in [0, 1).
func (r Random) Uniforms(s *Stream, u []float64) {
	h := len(u) / 2
	r.table.uniforms(&s.state, u[:h:h], u[h:])
}

// Outside counts the values, of a number that is a multiple of 32, that do not
// lie in [lo, hi]; NaN lies outside.
func (r Random) Outside(a []float64, lo, hi float64) int { return r.table.outside(a, lo, hi) }

func portableUniforms(state *[4][Lanes]uint64, u, v []float64) {
	v = v[:len(u)]
	for i := 0; i+Lanes <= len(u); i += Lanes {
		a, b := u[i:i+Lanes:i+Lanes], v[i:i+Lanes:i+Lanes]
		for l := range Lanes {
			s0, s1, s2, s3 := state[0][l], state[1][l], state[2][l], state[3][l]
			x := bits.RotateLeft64(s0+s3, 23) + s0
			t := s1 << 17
			s2 ^= s0
			s3 ^= s1
			s1 ^= s2
			s0 ^= s3
			s2 ^= t
			s3 = bits.RotateLeft64(s3, 45)
			y := bits.RotateLeft64(s0+s3, 23) + s0
			t = s1 << 17
			s2 ^= s0
			s3 ^= s1
			s1 ^= s2
			s0 ^= s3
			s2 ^= t
			s3 = bits.RotateLeft64(s3, 45)
			state[0][l], state[1][l], state[2][l], state[3][l] = s0, s1, s2, s3
			a[l] = 2 - math.Float64frombits(x>>12|0x3ff0000000000000)
			b[l] = math.Float64frombits(y>>12|0x3ff0000000000000) - 1
		}
	}
}

func portableBoxer(u, v []float64) {
	v = v[:len(u)]
	for i, x := range u {
		u[i] = math.Sqrt(-2 * logFast(x, 0))
	}
	var cosines [unit]float64
	for len(u) > 0 {
		n := min(len(u), unit)
		s, c := v[:n], cosines[:n]
		for i, x := range s {
			c[i] = math.FMA(x, 4, magic)
			s[i] = float64(math.FMA(c[i]-magic, -0.25, x) * tau)
		}
		quadrants(s, c)
		for i, r := range u[:n] {
			u[i], s[i] = float64(r*c[i]), float64(r*s[i])
		}
		u, v = u[n:], v[n:]
	}
}
