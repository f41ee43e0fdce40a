package footprint

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"strconv"
	"strings"

	"nightwright/scenarios/surveyfile"
)

// ASCII writes the map in the ASCII form of MOC 2.0, with a line feed at the
// end: orders and indices ascend, runs stand as ranges, and the map's order
// comes last where no cell has it.
func (m MOC) ASCII() []byte {
	var b []byte
	order := -1
	cells := m.Cells()
	for i := 0; i < len(cells); {
		c := cells[i]
		if c.Order != order {
			if order >= 0 {
				b = append(b, ' ')
			}
			order = c.Order
			b = append(strconv.AppendInt(b, int64(order), 10), '/')
		} else {
			b = append(b, ' ')
		}
		last := i
		for last+1 < len(cells) && cells[last+1] == (Cell{order, cells[last].Index + 1}) {
			last++
		}
		b = strconv.AppendInt(b, c.Index, 10)
		if last > i {
			b = strconv.AppendInt(append(b, '-'), cells[last].Index, 10)
		}
		i = last + 1
	}
	if order != m.order {
		if order >= 0 {
			b = append(b, ' ')
		}
		b = append(strconv.AppendInt(b, int64(m.order), 10), '/')
	}
	return append(b, '\n')
}

// JSON writes the map in the JSON form of MOC 2.0's appendix, with a line
// feed at the end; an empty list gives the map's order where no cell has it.
func (m MOC) JSON() []byte {
	b := []byte{'{'}
	order := -1
	for _, c := range m.Cells() {
		if c.Order != order {
			if order >= 0 {
				b = append(b, ']', ',')
			}
			order = c.Order
			b = fmt.Appendf(b, "%q:[", strconv.Itoa(order))
		} else {
			b = append(b, ',')
		}
		b = strconv.AppendInt(b, c.Index, 10)
	}
	if order >= 0 {
		b = append(b, ']')
	}
	if order != m.order {
		if order >= 0 {
			b = append(b, ',')
		}
		b = fmt.Appendf(b, "%q:[]", strconv.Itoa(m.order))
	}
	return append(b, '}', '\n')
}

const (
	wantMOC = "want a MOC in ASCII such as 3/1 5-8 4/40, or JSON such as {\"3\":[1,5]}"
	// maxMOCCells bounds a map that is read, in cells or ranges as written.
	maxMOCCells = 5_000_000
	// MaxMOCBytes is the longest MOC file that is read.
	MaxMOCBytes = 64 << 20
)

// ParseMOC reads a space MOC in ASCII or JSON. Cells may overlap and stand in
// any order: the map is made canonical. What is wrong comes back as a
// surveyfile.Issue with the line; file is the name for it.
func ParseMOC(file string, text []byte) (MOC, error) {
	p := mocReader{file: file, order: -1}
	trimmed := bytes.TrimLeft(text, " \t\r\n")
	switch {
	case len(text) > MaxMOCBytes:
		return MOC{}, p.fault(0, text, fmt.Sprintf("the map has %d bytes", len(text)), fmt.Sprintf("want at most %d", MaxMOCBytes))
	case len(trimmed) == 0:
		return MOC{}, p.fault(0, text, "the map is empty", wantMOC)
	case bytes.HasPrefix(trimmed, []byte("SIMPLE")):
		return MOC{}, p.fault(0, text, "it is a FITS file", wantMOC)
	case trimmed[0] == '{':
		return p.json(text)
	}
	return p.ascii(text)
}

// mocReader gathers the cells of a map.
type mocReader struct {
	file  string
	spans []span
	order int // deepest so far, -1: none
	count int
}

func (p *mocReader) fault(at int, text []byte, what, want string) error {
	line := 1 + bytes.Count(text[:min(at, len(text))], []byte{'\n'})
	return surveyfile.Issue{File: p.file, Line: line, What: what, Want: want}
}

// add adds the cells first..last of an order; it says what is wrong with
// them.
func (p *mocReader) add(order int, first, last int64) (what, want string) {
	p.count++
	switch n := CellCount(order); {
	case first > last:
		return fmt.Sprintf("the range %d-%d is reversed", first, last), "want the smaller index first"
	case last >= n:
		return fmt.Sprintf("the cell %d is not in order %d", last, order), fmt.Sprintf("want 0 to %d", n-1)
	case p.count > maxMOCCells:
		return "the map has too many cells", fmt.Sprintf("want at most %d", maxMOCCells)
	}
	b := below(order)
	p.spans = append(p.spans, span{first * b, (last + 1) * b})
	return "", ""
}

func (p *mocReader) done() MOC { return MOC{max(p.order, 0), merged(p.spans)} }

func (p *mocReader) ascii(text []byte) (MOC, error) {
	order, start := -1, true
	for at := 0; at < len(text); {
		if strings.IndexByte(" \t\r\n", text[at]) >= 0 {
			at++
			continue
		}
		end := at
		for end < len(text) && strings.IndexByte(" \t\r\n", text[end]) < 0 {
			end++
		}
		word := string(text[at:end])
		if start {
			start = false
			if strings.HasPrefix(word, "t") {
				return MOC{}, p.fault(at, text, "it is a map of times", wantMOC)
			}
			if word = strings.TrimPrefix(word, "s"); word == "" {
				at = end
				continue
			}
		}
		if head, rest, ok := strings.Cut(word, "/"); ok {
			n, err := strconv.Atoi(head)
			if err != nil || n < 0 || n > MaxOrder || !digits(head) {
				return MOC{}, p.fault(at, text, fmt.Sprintf("%q is no order", clip(head)), "want a whole number from 0 to 29 before the /")
			}
			order, p.order, word = n, max(p.order, n), rest
		}
		if word != "" {
			if order < 0 {
				return MOC{}, p.fault(at, text, fmt.Sprintf("%q stands before any order", clip(word)), wantMOC)
			}
			head, tail, ranged := strings.Cut(word, "-")
			if !ranged {
				tail = head
			}
			first, err1 := strconv.ParseInt(head, 10, 64)
			last, err2 := strconv.ParseInt(tail, 10, 64)
			if err1 != nil || err2 != nil || !digits(head) || !digits(tail) {
				return MOC{}, p.fault(at, text, fmt.Sprintf("%q is no cell", clip(word)), "want cells such as 12 or 12-14, with blanks between")
			}
			if what, want := p.add(order, first, last); what != "" {
				return MOC{}, p.fault(at, text, what, want)
			}
		}
		at = end
	}
	if p.order < 0 {
		return MOC{}, p.fault(0, text, "the map has no order", wantMOC)
	}
	return p.done(), nil
}

func digits(s string) bool { return s != "" && strings.Trim(s, "0123456789") == "" }

func (p *mocReader) json(text []byte) (MOC, error) {
	d := json.NewDecoder(bytes.NewReader(text))
	d.UseNumber()
	// at is where the token that was just read ends.
	at := func() int { return int(d.InputOffset()) }
	if err := p.object(d, text, at, true); err != nil {
		var issue surveyfile.Issue
		if errors.As(err, &issue) {
			return MOC{}, err
		}
		return MOC{}, p.fault(at(), text, "it is no JSON here: "+clip(err.Error()), wantMOC)
	}
	if _, err := d.Token(); !errors.Is(err, io.EOF) {
		return MOC{}, p.fault(at(), text, "something follows the map", wantMOC)
	}
	if p.order < 0 {
		return MOC{}, p.fault(at(), text, "the map has no order", wantMOC)
	}
	return p.done(), nil
}

// object reads {"order":[cells], ...}, or at the top {"s":{...}}.
func (p *mocReader) object(d *json.Decoder, text []byte, at func() int, top bool) error {
	t, err := d.Token()
	if err != nil {
		return err
	}
	if t != json.Delim('{') {
		return p.fault(at(), text, fmt.Sprintf("%v stands where orders should", t), wantMOC)
	}
	for d.More() {
		t, err := d.Token()
		if err != nil {
			return err
		}
		key, _ := t.(string)
		if key == "s" && top {
			if err := p.object(d, text, at, false); err != nil {
				return err
			}
			continue
		}
		order, err := strconv.Atoi(key)
		if err != nil || !digits(key) || order > MaxOrder {
			return p.fault(at(), text, fmt.Sprintf("%q is no order", clip(key)), "want a whole number from 0 to 29")
		}
		p.order = max(p.order, order)
		if err := p.cells(d, text, at, order); err != nil {
			return err
		}
	}
	_, err = d.Token()
	return err
}

func (p *mocReader) cells(d *json.Decoder, text []byte, at func() int, order int) error {
	t, err := d.Token()
	if err != nil {
		return err
	}
	if t != json.Delim('[') {
		return p.fault(at(), text, fmt.Sprintf("order %d has %v", order, t), "want a list of cells in []")
	}
	for d.More() {
		t, err := d.Token()
		if err != nil {
			return err
		}
		number, ok := t.(json.Number)
		v, err := strconv.ParseInt(string(number), 10, 64)
		if !ok || err != nil || v < 0 {
			return p.fault(at(), text, fmt.Sprintf("%v is no cell", t), "want whole numbers from 0")
		}
		if what, want := p.add(order, v, v); what != "" {
			return p.fault(at(), text, what, want)
		}
	}
	_, err = d.Token()
	return err
}

// clip shortens a text for a message.
func clip(s string) string {
	const most = 60
	if r := []rune(s); len(r) > most {
		return string(r[:most]) + "..."
	}
	return s
}
