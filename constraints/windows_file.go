package constraints

import (
	"bufio"
	"bytes"
	"crypto/sha256"
	"encoding/binary"
	"errors"
	"fmt"
	"hash"
	"hash/crc32"
	"io"
	"math"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// WindowsForm numbers the way windows are worked out; it changes with every
// change that can change a window, so that older stores are not read any more.
const WindowsForm = 1

// WindowsKey is the SHA-256 of all that the windows of a survey depend on: two
// surveys with one key have the same windows. Weights, demands' counts, closures
// and losses are not among it.
func WindowsKey(sv *survey.Survey, sky *visibility.Sky, cal *Calendar) [32]byte {
	w := &Windows{epoch: Epoch(sv), sv: sv, calendar: cal}
	w.setClasses()
	w.setUnits()
	h := &hasher{Hash: sha256.New()}
	h.whole(WindowsForm, w.epoch, int64(sv.FirstNight), int64(sv.LastNight), int64(len(w.units)), int64(len(w.classes)))
	for i := range sv.Sites {
		s := &sv.Sites[i]
		h.real(s.Latitude, s.Longitude, s.Elevation)
		h.whole(int64(len(s.Horizon)))
		for _, p := range s.Horizon {
			h.real(p.Azimuth, p.Altitude)
		}
		// The Earth's orientation and the leap seconds, as the sky has them.
		for n := range cal.Nights() {
			in := cal.Night(i, n)
			fr := sky.Frame(i, in.From)
			h.real(in.From, in.To, fr.East[0], fr.East[1], fr.Sun[0], fr.Moon[2])
		}
	}
	for _, c := range w.classes {
		h.whole(int64(c.site), int64(c.kind), truth(c.hasAzimuth), truth(c.hasFlip))
		h.real(c.altMin, c.altMax, c.azimuth.From, c.azimuth.To, c.flip.PastMeridian)
	}
	for i := range w.units {
		u := &w.units[i]
		f := &sv.Fields[u.field]
		r := &u.rules
		h.real(f.RA, f.Dec, f.PMRA, f.PMDec, f.NotBefore, f.NotAfter)
		h.real(r.AltitudeMin, r.AirmassMax, r.SunAltitudeMax, r.MoonSeparationMin, r.MoonIlluminationMax, r.HourAngleMax)
	}
	var bits []byte
	for _, need := range w.needed() {
		bits = append(bits, byte(truth(need)))
	}
	h.Write(bits)
	return [32]byte(h.Sum(nil))
}

func truth(b bool) int64 {
	if b {
		return 1
	}
	return 0
}

// hasher writes numbers into a hash.
type hasher struct {
	hash.Hash
	buf []byte
}

func (h *hasher) whole(list ...int64) {
	h.buf = h.buf[:0]
	for _, x := range list {
		h.buf = binary.LittleEndian.AppendUint64(h.buf, uint64(x))
	}
	h.Write(h.buf)
}

func (h *hasher) real(list ...float64) {
	h.buf = h.buf[:0]
	for _, x := range list {
		h.buf = binary.LittleEndian.AppendUint64(h.buf, math.Float64bits(x))
	}
	h.Write(h.buf)
}

// windowsMagic opens a store of windows.
const windowsMagic = "nightwright windows\n"

var castagnoli = crc32.MakeTable(crc32.Castagnoli)

// Store writes windows under their key, for ReadWindows.
func (w *Windows) Store(to io.Writer, key [32]byte) error {
	b := bufio.NewWriterSize(to, 1<<20)
	sum := crc32.New(castagnoli)
	out := io.MultiWriter(b, sum)
	io.WriteString(out, windowsMagic)
	out.Write(key[:])
	buf := make([]byte, 0, 1<<16)
	put := func(list []uint32) {
		buf = binary.LittleEndian.AppendUint32(buf[:0], uint32(len(list)))
		for _, x := range list {
			if buf = binary.LittleEndian.AppendUint32(buf, x); len(buf) > 1<<16-8 {
				out.Write(buf)
				buf = buf[:0]
			}
		}
		out.Write(buf)
	}
	for i := range w.nights {
		n := &w.nights[i]
		put(n.at)
		put(n.odd)
		put(n.oddAt)
		put(numbers(n.windows))
		put(numbers(n.oddWindows))
	}
	b.Write(binary.LittleEndian.AppendUint32(nil, sum.Sum32()))
	return b.Flush() // it keeps the first error
}

func numbers(list []Window) []uint32 {
	out := make([]uint32, 0, 2*len(list))
	for _, x := range list {
		out = append(out, uint32(x.From), uint32(x.To))
	}
	return out
}

// ErrNotTheseWindows says that a store holds something else.
var ErrNotTheseWindows = errors.New("constraints: no store of these windows")

// ReadWindows takes windows out of a store of them. It errs with
// ErrNotTheseWindows in the chain when the store is damaged or of another key.
func ReadWindows(store []byte, key [32]byte, sv *survey.Survey, cal *Calendar, workers int) (*Windows, error) {
	head := len(windowsMagic) + len(key)
	if len(store) < head+4 || !bytes.HasPrefix(store, []byte(windowsMagic)) || !bytes.Equal(store[len(windowsMagic):head], key[:]) {
		return nil, ErrNotTheseWindows
	}
	body := store[:len(store)-4]
	if crc32.Checksum(body, castagnoli) != binary.LittleEndian.Uint32(store[len(body):]) {
		return nil, fmt.Errorf("%w: it is damaged", ErrNotTheseWindows)
	}
	w := &Windows{epoch: Epoch(sv), sv: sv, calendar: cal, nights: make([]nightWindows, cal.Nights())}
	w.setClasses()
	w.setUnits()
	// Where each night's parts are; then they are turned side by side.
	parts := make([][5][]byte, len(w.nights))
	at := head
	for i := range parts {
		for k := range parts[i] {
			if at+4 > len(body) {
				return nil, fmt.Errorf("%w: it ends early", ErrNotTheseWindows)
			}
			n := 4 * int(binary.LittleEndian.Uint32(body[at:]))
			if at += 4; n > len(body)-at {
				return nil, fmt.Errorf("%w: it ends early", ErrNotTheseWindows)
			}
			parts[i][k] = body[at : at+n]
			at += n
		}
	}
	if at != len(body) {
		return nil, fmt.Errorf("%w: something follows", ErrNotTheseWindows)
	}
	parallel(workers, len(parts), func(i int) {
		p := &parts[i]
		w.nights[i] = nightWindows{
			at: words(p[0]), odd: words(p[1]), oddAt: words(p[2]), windows: pairs(p[3]), oddWindows: pairs(p[4]),
		}
	})
	cells := len(w.classes)*len(w.units) + 1
	for i := range w.nights {
		n := &w.nights[i]
		if len(n.at) != cells || int(n.at[cells-1]) != len(n.windows) || len(n.odd) > 0 && (len(n.oddAt) != len(n.odd)+1 || int(n.oddAt[len(n.odd)]) != len(n.oddWindows)) {
			return nil, fmt.Errorf("%w: night %d has another size", ErrNotTheseWindows, i)
		}
	}
	return w, nil
}

func words(b []byte) []uint32 {
	if len(b) == 0 {
		return nil
	}
	out := make([]uint32, len(b)/4)
	for i := range out {
		out[i] = binary.LittleEndian.Uint32(b[4*i:])
	}
	return out
}

func pairs(b []byte) []Window {
	if len(b) == 0 {
		return nil
	}
	out := make([]Window, len(b)/8)
	for i := range out {
		out[i] = Window{int32(binary.LittleEndian.Uint32(b[8*i:])), int32(binary.LittleEndian.Uint32(b[8*i+4:]))}
	}
	return out
}
