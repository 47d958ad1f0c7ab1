//go:build !amd64

package march

// fastest is the only set of kernels here.
func fastest() instructions { return goCode }

func (instructions) accumulate(u, w []float64, c float64) { accumulate(u, w, c) }

func (instructions) combine(y, u []float64, k [][]float64, c []float64) { combine(y, u, k, c) }

func (instructions) pair(x, y, p, q []float64, c *[4]float64) { pair(x, y, p, q, c) }
