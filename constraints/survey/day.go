package survey

import (
	"fmt"
	"time"
)

// Day is a calendar date as days since 1970-01-01; a night label.
type Day int32

// ParseDay reads YYYY-MM-DD.
func ParseDay(s string) (Day, error) {
	t, err := time.Parse(time.DateOnly, s)
	if err != nil {
		return 0, fmt.Errorf("got %q; want a date such as 2027-02-01", s)
	}
	return Day(t.Unix() / 86400), nil
}

// String writes YYYY-MM-DD.
func (d Day) String() string { return d.Time().Format(time.DateOnly) }

// Time is 00:00 UTC of the date.
func (d Day) Time() time.Time { return time.Unix(int64(d)*86400, 0).UTC() }

// Unix is 00:00 UTC of the date in Unix seconds.
func (d Day) Unix() float64 { return float64(d) * 86400 }

// Month is 0..11.
func (d Day) Month() int { return int(d.Time().Month()) - 1 }
