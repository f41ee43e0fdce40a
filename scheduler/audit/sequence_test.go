package audit

import (
	"math"
	"math/rand/v2"
	"testing"

	"nightwright/constraints/mount"
	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// TestAxisSeconds: rates and times one can work out by head. A telescope of 3
// deg/s and 1.5 deg/s^2 is at full speed after 2 s and 3 deg, and needs as
// much to stop: 6 deg take 4 s, 1.5 deg a triangle of 2 s, 30 deg 12 s.
func TestAxisSeconds(t *testing.T) {
	slew := survey.Slew{Rate: 3 * deg, Acceleration: 1.5 * deg}
	for _, tt := range []struct{ give, want float64 }{
		{0, 0}, {1.5, 2}, {-1.5, 2}, {6, 4}, {30, 12}, {-180, 62},
	} {
		if got := axisSeconds(tt.give*deg, slew); math.Abs(got-tt.want) > 1e-9 {
			t.Errorf("%v deg: %v s, want %v", tt.give, got, tt.want)
		}
	}
}

func judgeOf(t survey.Telescope) *Judge {
	return &Judge{sv: &survey.Survey{Telescopes: []survey.Telescope{t}}}
}

// aim is a shot that points as told, at its start and its end, in degrees.
func aim(alt, az, ha, dec float64, filter int) *shot {
	h := visibility.Horizontal{Altitude: alt * deg, Azimuth: az * deg, HourAngle: ha * deg, Declination: dec * deg}
	return &shot{start: sight{star: h}, end: sight{star: h}, startTurn: az * deg, endTurn: az * deg, filter: filter}
}

// TestBetween: the contract's formula on cases worked by hand.
func TestBetween(t *testing.T) {
	alt := survey.Telescope{Mount: survey.Altazimuth, Slew: survey.Slew{Rate: 3 * deg, Acceleration: 1.5 * deg, Settle: 3}, Readout: 8, FilterChange: 45}
	wrap := alt
	wrap.AzimuthRange = &survey.AzimuthRange{From: -180 * deg, To: 180 * deg}
	during := alt
	during.DuringSlew = true
	equatorial := alt
	equatorial.Mount = survey.Equatorial
	flip := equatorial
	flip.Flip = &survey.Flip{Time: 60, PastMeridian: deg}
	tests := []struct {
		name string
		on   survey.Telescope
		a, b *shot
		want float64
	}{
		{"the same place: readout", alt, aim(50, 10, 0, 0, 0), aim(50, 10, 0, 0, 0), 8},
		{"6 deg: 4 s and settle, under the readout", alt, aim(50, 10, 0, 0, 0), aim(56, 10, 0, 0, 0), 8},
		{"30 deg: 12 s and settle", alt, aim(50, 10, 0, 0, 0), aim(50, 40, 0, 0, 0), 15},
		{"the slower axis", alt, aim(50, 10, 0, 0, 0), aim(30, 40, 0, 0, 0), 15},
		{"the shorter way round", alt, aim(50, 350, 0, 0, 0), aim(50, 20, 0, 0, 0), 15},
		{"filter on top", alt, aim(50, 10, 0, 0, 0), aim(50, 40, 0, 0, 1), 60},
		{"filter inside", during, aim(50, 10, 0, 0, 0), aim(50, 40, 0, 0, 1), 45},
		{"never over the range's end: 330 deg", wrap, aim(50, 165, 0, 0, 0), aim(50, -165, 0, 0, 0), 330./3 + 2 + 3},
		{"inside the range", wrap, aim(50, -15, 0, 0, 0), aim(50, 15, 0, 0, 0), 15},
		{"hour angle", equatorial, aim(0, 0, -20, 10, 0), aim(0, 0, 10, 20, 0), 15},
		{"never past 12 h: 330 deg", equatorial, aim(0, 0, -165, 10, 0), aim(0, 0, 165, 20, 0), 330./3 + 2 + 3},
		{"flip", flip, aim(0, 0, -20, 10, 0), aim(0, 0, 10, 20, 0), 75},
		{"flip and filter", flip, aim(0, 0, -20, 10, 0), aim(0, 0, 10, 20, 1), 120},
		{"no flip on one side", flip, aim(0, 0, -40, 10, 0), aim(0, 0, -10, 20, 0), 15},
	}
	for _, tt := range tests {
		if got := judgeOf(tt.on).between(tt.a, tt.b); math.Abs(got-tt.want) > 1e-9 {
			t.Errorf("%s: %v s, want %v", tt.name, got, tt.want)
		}
	}
}

// TestBetweenAgreesWithMounts holds the plain slew against the mounts' own.
func TestBetweenAgreesWithMounts(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 1))
	for range 5000 {
		on := survey.Telescope{
			Mount: survey.MountKind(1 + r.IntN(2)), Slew: survey.Slew{Rate: (0.5 + 4*r.Float64()) * deg, Acceleration: (0.2 + 3*r.Float64()) * deg},
		}
		if on.Mount == survey.Altazimuth && r.IntN(2) == 0 {
			from := (r.Float64()*720 - 360) * deg
			on.AzimuthRange = &survey.AzimuthRange{From: from, To: from + 2*math.Pi}
		}
		a := aim(r.Float64()*90, r.Float64()*360, r.Float64()*360-180, r.Float64()*180-90, 0)
		b := aim(r.Float64()*90, r.Float64()*360, r.Float64()*360-180, r.Float64()*180-90, 0)
		if on.AzimuthRange != nil {
			for _, s := range []*shot{a, b} {
				s.startTurn = on.AzimuthRange.From + turn(s.startTurn-on.AzimuthRange.From)
				s.endTurn = s.startTurn
			}
		}
		point := func(s *shot) mount.Pointing {
			h := &s.start.star
			return mount.Pointing{Altitude: h.Altitude, Azimuth: h.Azimuth, HourAngle: h.HourAngle, Declination: h.Declination}
		}
		got, want := judgeOf(on).between(a, b), mount.SlewTime(&on, point(a), point(b))
		if math.Abs(got-want) > 1e-9 {
			t.Fatalf("%+v: from %+v to %+v: %v s, the mount says %v", on, point(a), point(b), got, want)
		}
	}
}

// TestOverlapIsSeenPastShorterOnes: an exposure that covers two others.
func TestOverlapIsSeenPastShorterOnes(t *testing.T) {
	f := makeFixture(t)
	f.sv.Programs[0].Demands[1].Exposures[0].Duration = 4000
	v := *f.at("F2", "r", lamp, 0)
	v.End = v.Start + 4000e6
	f.visits = []Visit{v}
	for k := range 2 {
		x := *makeFixture(t).at("F3", "g", lamp, 0)
		x.Visit, x.Start = int64(200+k), v.Start+int64(500*(k+1))*1e6
		x.End = x.Start + 60e6
		f.visits = append(f.visits, x)
	}
	f.sv.Programs[0].Demands[0].GapMin = 0
	r, err := f.judge(t).Check(t.Context(), Plan{Visits: f.visits, LegalityOnly: true})
	if err != nil {
		t.Fatal(err)
	}
	n := 0
	for _, b := range r.Breaches {
		if b.Rule == RuleGap && b.Measured <= -3000 {
			n++
		}
	}
	if n != 2 {
		t.Errorf("both lie within the long exposure: %+v", r.Breaches)
	}
}
