package seasons

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/stat/distuv"
)

// Interval is a mean with its 95 % interval.
type Interval struct {
	Mean float64 `json:"mean"`
	Low  float64 `json:"low"`
	High float64 `json:"high"`
}

// MeanInterval returns the mean and Student's 95 % interval of it (Student
// 1908): mean +- t(0.975, n-1) s / sqrt(n). With fewer than two values the
// interval is the mean alone.
func MeanInterval(x []float64) Interval {
	n := float64(len(x))
	if n == 0 {
		return Interval{}
	}
	mean := 0.0
	for _, v := range x {
		mean += v
	}
	mean /= n
	if n < 2 {
		return Interval{mean, mean, mean}
	}
	ss := 0.0
	for _, v := range x {
		ss += (v - mean) * (v - mean)
	}
	half := distuv.StudentsT{Mu: 0, Sigma: 1, Nu: n - 1}.Quantile(0.975) * math.Sqrt(ss/(n-1)/n)
	return Interval{mean, mean - half, mean + half}
}

// Paired is MeanInterval of the differences a - b of pairs.
func Paired(a, b []float64) Interval {
	d := make([]float64, len(a))
	for i := range a {
		d[i] = a[i] - b[i]
	}
	return MeanInterval(d)
}

// Ratio is sum(a) / sum(b) of pairs with the 95 % interval of the ratio
// estimator: its residuals a - R b over the mean of b (Cochran 1977, section
// 2.11).
func Ratio(a, b []float64) Interval {
	var sa, sb float64
	for i := range a {
		sa += a[i]
		sb += b[i]
	}
	if sb == 0 {
		return Interval{}
	}
	r := sa / sb
	d := make([]float64, len(a))
	for i := range a {
		d[i] = (a[i] - r*b[i]) / (sb / float64(len(b)))
	}
	v := MeanInterval(d)
	return Interval{r, r + v.Low - v.Mean, r + v.High - v.Mean}
}

// Quantile returns the p-quantile of sorted values, linear between them (type
// 7 of Hyndman & Fan 1996).
func Quantile(sorted []float64, p float64) float64 {
	if len(sorted) == 0 {
		return 0
	}
	h := p * float64(len(sorted)-1)
	k := min(int(h), len(sorted)-1)
	if k == len(sorted)-1 {
		return sorted[k]
	}
	return sorted[k] + (h-float64(k))*(sorted[k+1]-sorted[k])
}

func sorted(x []float64) []float64 {
	y := slices.Clone(x)
	slices.Sort(y)
	return y
}
