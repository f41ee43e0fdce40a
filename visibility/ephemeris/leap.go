package ephemeris

import (
	"bufio"
	"crypto/sha1"
	_ "embed"
	"encoding/hex"
	"fmt"
	"io"
	"sort"
	"strconv"
	"strings"
	"sync"
)

//go:embed leapseconds.list
var embeddedLeapSeconds string

// ntpToUnix is 1970-01-01 in seconds since 1900-01-01.
const ntpToUnix = 2208988800

// LeapTable is TAI-UTC as a function of UTC, from 1972 on. It is immutable.
type LeapTable struct {
	from    []float64 // Unix s of each first instant, ascending
	offset  []float64 // TAI-UTC from there on, s
	expires float64   // Unix s; 0 when the file doesn't say
}

var parseEmbedded = sync.OnceValue(func() *LeapTable {
	t, err := ParseLeapSeconds(strings.NewReader(embeddedLeapSeconds))
	if err != nil {
		panic("ephemeris: the embedded leap-second table: " + err.Error())
	}
	return t
})

// EmbeddedLeapSeconds returns the table built into the program: 27 leap
// seconds from 1972-07-01 to 2017-01-01, complete until 2027-06-28 (IERS
// Bulletin C).
func EmbeddedLeapSeconds() *LeapTable { return parseEmbedded() }

// Expires returns the instant (UTC, Unix s) up to which the table is known to
// be complete; 0 when its file didn't say.
func (t *LeapTable) Expires() float64 { return t.expires }

// At returns TAI-UTC in s at a UTC instant in Unix s. Before the table's
// first row (1972) the first value holds: there UTC was something else.
func (t *LeapTable) At(unix float64) float64 {
	n := len(t.from) - 1
	if unix >= t.from[n] {
		return t.offset[n]
	}
	i := sort.Search(n, func(i int) bool { return t.from[i] > unix })
	if i == 0 {
		return t.offset[0]
	}
	return t.offset[i-1]
}

// dayLength returns the UTC seconds in the day that starts at the given Unix
// s: 86401 when it ends in a leap second.
func (t *LeapTable) dayLength(unix float64) float64 {
	return 86400 + t.At(unix+86400) - t.At(unix)
}

// ParseLeapSeconds reads a file in the form of the IETF's and IERS's
// leap-seconds.list: rows of seconds since 1900 and TAI-UTC, comments from #,
// "#$" last update, "#@" expiry, "#h" SHA-1, which must match when it is
// there. Errors start with "line N: ".
func ParseLeapSeconds(r io.Reader) (*LeapTable, error) {
	var (
		t            LeapTable
		hash         string
		hashLine, n  int
		digits, dues strings.Builder // what the hash covers, in its order
	)
	sc := bufio.NewScanner(r)
	for sc.Scan() {
		n++
		line := strings.TrimSpace(strings.TrimPrefix(sc.Text(), "\ufeff"))
		switch {
		case strings.HasPrefix(line, "#$"), strings.HasPrefix(line, "#@"):
			word := strings.TrimSpace(line[2:])
			v, err := ntpSeconds(word)
			if err != nil {
				return nil, fmt.Errorf("line %d: %w", n, err)
			}
			dues.WriteString(word)
			if line[1] == '@' {
				t.expires = v
			}
		case strings.HasPrefix(line, "#h"):
			hash, hashLine = line[2:], n
		case line == "" || line[0] == '#':
		default:
			if err := t.addRow(line, &digits); err != nil {
				return nil, fmt.Errorf("line %d: %w", n, err)
			}
		}
	}
	if err := sc.Err(); err != nil {
		return nil, fmt.Errorf("line %d: not a text line: %w", n+1, err)
	}
	if len(t.from) == 0 {
		return nil, fmt.Errorf("line %d: no leap seconds found; rows of two whole numbers, seconds since 1900 and TAI-UTC, are wanted", n)
	}
	if t.expires != 0 && t.expires < t.from[len(t.from)-1] {
		return nil, fmt.Errorf("line %d: the file expires before its last row begins; the expiry after #@ must be later", n)
	}
	if hashLine > 0 {
		if err := checkHash(hash, dues.String()+digits.String()); err != nil {
			return nil, fmt.Errorf("line %d: %w", hashLine, err)
		}
	}
	return &t, nil
}

// addRow takes one data line and appends what the file's hash covers of it.
func (t *LeapTable) addRow(line string, digits *strings.Builder) error {
	body, _, _ := strings.Cut(line, "#")
	words := strings.Fields(body)
	if len(words) != 2 {
		return fmt.Errorf("%d columns; two are wanted: seconds since 1900 and TAI-UTC", len(words))
	}
	from, err := ntpSeconds(words[0])
	if err != nil {
		return err
	}
	if int64(from)%86400 != 0 {
		return fmt.Errorf("%s isn't the start of a UTC day; it must be a multiple of 86400", words[0])
	}
	offset, err := strconv.Atoi(words[1])
	if err != nil || offset < 10 || offset > 200 {
		return fmt.Errorf("TAI-UTC %q; whole seconds from 10 to 200 are wanted", words[1])
	}
	if n := len(t.from); n > 0 {
		if from <= t.from[n-1] {
			return fmt.Errorf("%s isn't after the row before; rows must ascend", words[0])
		}
		if step := float64(offset) - t.offset[n-1]; step != 1 && step != -1 {
			return fmt.Errorf("TAI-UTC goes from %g to %d s; a leap second changes it by one", t.offset[n-1], offset)
		}
	}
	t.from = append(t.from, from)
	t.offset = append(t.offset, float64(offset))
	digits.WriteString(words[0])
	digits.WriteString(words[1])
	return nil
}

// ntpSeconds reads whole seconds since 1900, from 1972 on, as Unix s.
func ntpSeconds(word string) (float64, error) {
	v, err := strconv.ParseInt(word, 10, 64)
	if err != nil || v < 2272060800 || v > 1e11 {
		return 0, fmt.Errorf("%q; whole seconds since 1900-01-01, from 2272060800 (1972-01-01) on, are wanted", word)
	}
	return float64(v - ntpToUnix), nil
}

// checkHash compares the five groups of hexadecimal digits after #h (leading
// zeros may be missing) with the SHA-1 of the covered digits.
func checkHash(hash, covered string) error {
	groups := strings.Fields(hash)
	if len(groups) != 5 {
		return fmt.Errorf("#h has %d groups; five of up to eight hexadecimal digits are wanted", len(groups))
	}
	sum := sha1.Sum([]byte(covered))
	for i, g := range groups {
		want := hex.EncodeToString(sum[4*i : 4*i+4])
		if len(g) > 8 || strings.ToLower(strings.Repeat("0", 8-len(g))+g) != want {
			return fmt.Errorf("the checksum after #h doesn't match the rows; the file is damaged, fetch it afresh")
		}
	}
	return nil
}
