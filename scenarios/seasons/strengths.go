package seasons

import (
	"math"

	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
)

// binning sorts credit by what was observed: bands of declination, months,
// phases of the Moon.
type binning struct {
	n     int
	dec   []uint8   // [field]
	month []uint8   // [night]
	moon  [][]uint8 // [site][night]
}

// The bins, in their order.
const (
	decBins   = 6 // of 30 degrees, from the south pole
	monthBins = 12
	moonBins  = 3
)

// Bin names one bin: its kind and what it holds.
type Bin struct{ Kind, Name string }

// Bins lists what credit is sorted by, in the order of Outcome.Credit.
func Bins() []Bin {
	out := []Bin{}
	for _, s := range []string{"-90 to -60", "-60 to -30", "-30 to 0", "0 to +30", "+30 to +60", "+60 to +90"} {
		out = append(out, Bin{"declination", s})
	}
	for _, s := range []string{"01", "02", "03", "04", "05", "06", "07", "08", "09", "10", "11", "12"} {
		out = append(out, Bin{"month", s})
	}
	for _, s := range []string{"dark", "grey", "bright"} {
		out = append(out, Bin{"moon", s})
	}
	return out
}

// Grey and bright nights by the lit part of the Moon at the site's midnight
// (common practice: dark below a quarter, bright above some two thirds).
const (
	greyFrom   = 0.25
	brightFrom = 0.65
)

func newBinning(st *Stage) *binning {
	b := &binning{n: decBins + monthBins + moonBins}
	sv := st.Survey
	for i := range sv.Fields {
		d := (sv.Fields[i].Dec*180/math.Pi + 90) / 30
		b.dec = append(b.dec, uint8(max(0, min(decBins-1, int(d)))))
	}
	for n := range sv.Nights() {
		b.month = append(b.month, uint8((sv.FirstNight + survey.Day(n)).Month()))
	}
	for s := range sv.Sites {
		row := make([]uint8, sv.Nights())
		for n := range row {
			night := st.p.Calendar.Night(s, n)
			fr := st.p.Sky.Frame(s, (night.From+night.To)/2)
			switch {
			case fr.Illumination >= brightFrom:
				row[n] = 2
			case fr.Illumination >= greyFrom:
				row[n] = 1
			}
		}
		b.moon = append(b.moon, row)
	}
	return b
}

// add sorts the credit of a visit, C.
func (b *binning) add(credit []float64, s *scope, w *model.Want, c float64) {
	row := credit[int(s.site)*b.n : (int(s.site)+1)*b.n]
	row[b.dec[w.Field]] += c
	row[decBins+int(b.month[s.night])] += c
	row[decBins+monthBins+int(b.moon[s.site][s.night])] += c
}
