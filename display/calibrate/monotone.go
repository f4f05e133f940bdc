package calibrate

// monotone is the rising sequence nearest to v, by least squares with the weights w (nil: all alike):
// neighbours that fall are pooled into their mean.
func monotone(v, w []float64) []float64 {
	type pool struct {
		sum, weight float64
		n           int
	}
	var pools []pool
	for i, y := range v {
		k := 1.0
		if w != nil {
			k = w[i]
		}
		pools = append(pools, pool{k * y, k, 1})
		for n := len(pools); n > 1 && pools[n-2].sum*pools[n-1].weight > pools[n-1].sum*pools[n-2].weight; n-- {
			a, b := pools[n-2], pools[n-1]
			pools = append(pools[:n-2], pool{a.sum + b.sum, a.weight + b.weight, a.n + b.n})
		}
	}
	out := make([]float64, 0, len(v))
	for _, p := range pools {
		for range p.n {
			out = append(out, p.sum/p.weight)
		}
	}
	return out
}
