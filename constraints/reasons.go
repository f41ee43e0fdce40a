package constraints

import "strings"

// Reasons is the set of rules that an instant breaks.
type Reasons uint16

// The rules, in the order in which they are told.
const (
	Closed           Reasons = 1 << iota // a closure of site or telescope
	Lost                                 // time recorded as lost
	Dates                                // not_before, not_after
	Sun                                  // sun_altitude_max
	Altitude                             // altitude_min
	Airmass                              // airmass_max
	HourAngle                            // hour_angle_max
	Horizon                              // the site's horizon mask
	MountAltitude                        // the mount's altitude limits
	AzimuthRange                         // the mount's azimuth range
	MoonIllumination                     // moon_illumination_max
	MoonSeparation                       // moon_separation_min
	Quality                              // min_quality
	Reserved                             // a reserved block of the telescope
)

// ReasonCount is the number of rules.
const ReasonCount = len(reasonNames)

var reasonNames = [...]string{
	"closed", "lost", "dates", "sun", "altitude", "airmass", "hour_angle", "horizon",
	"mount_altitude", "azimuth_range", "moon_illumination", "moon_separation", "quality", "reserved",
}

// Reason returns the i-th rule, 0 to ReasonCount-1.
func Reason(i int) Reasons { return 1 << i }

// Names returns the words of the rules in the set, in their fixed order.
func (r Reasons) Names() []string {
	var out []string
	for i, name := range reasonNames {
		if r&(1<<i) != 0 {
			out = append(out, name)
		}
	}
	return out
}

// String joins the names with commas, as the grid's blocked_by column has them.
func (r Reasons) String() string { return strings.Join(r.Names(), ",") }
