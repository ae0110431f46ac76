package toys

import (
	"math"

	//lint:ignore SA1019 its streams are what published seeds stand for; this is its one import
	"golang.org/x/exp/rand"
)

// purpose keeps the streams of different uses of one seed apart.
type purpose uint64

const (
	signalToys purpose = 1 + iota
	nullToys
	pilotLimitToys
	limitToys
	exclusionToys
	crosscheckToys
	bootstrap // plus the purpose of the toys resampled
)

// stream is the random numbers of one component in one block. What it gives
// depends on its key alone.
type stream struct {
	rand.Rand
	source rand.Source
}

func newStream() *stream {
	source := rand.NewSource(0)
	return &stream{*rand.New(source), source}
}

// restart begins the stream of a key.
func (s *stream) restart(k key) {
	h := mix(k.seed)
	for _, part := range [...]uint64{uint64(k.purpose), math.Float64bits(k.luminosity), uint64(k.component), uint64(k.block)} {
		h = mix(h ^ part)
	}
	s.source.Seed(h)
}

// key names a stream. The luminosity enters by value, not by its place in a
// list, so that a longer list changes no old result.
type key struct {
	seed       uint64
	purpose    purpose
	luminosity float64
	component  int
	block      int
}

// mix is SplitMix64: Steele, Lea & Flood, Fast splittable pseudorandom number
// generators, OOPSLA 2014, with the constants of Stafford's variant 13.
func mix(x uint64) uint64 {
	x += 0x9e3779b97f4a7c15
	x = (x ^ x>>30) * 0xbf58476d1ce4e5b9
	x = (x ^ x>>27) * 0x94d049bb133111eb
	return x ^ x>>31
}
