package formats

import (
	"bufio"
	"encoding/xml"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"nightwright/scheduler/tables"
)

// Info is a named remark in a VOTable.
type Info struct{ Name, Value string }

// Document is a VOTable of one table.
type Document struct {
	About string
	Infos []Info
	Table Table
	After []Info // that follow the table, such as that it was cut short
}

// WriteVOTable writes a document as VOTable 1.4, cells as TABLEDATA.
// Instants are modified Julian dates that refer to a TIMESYS (UTC at the
// telescope), good to a microsecond; right ascensions and declinations refer
// to a COOSYS (ICRS). Null is an empty cell.
func WriteVOTable(w io.Writer, d Document) error {
	b := bufio.NewWriterSize(w, 1<<16)
	b.WriteString(`<?xml version="1.0" encoding="UTF-8"?>
<VOTABLE version="1.4" xmlns="http://www.ivoa.net/xml/VOTable/v1.3">
`)
	coords, times := false, false
	for _, c := range d.Table.Columns {
		coords = coords || c.frame() == "icrs"
		times = times || c.frame() == "utc"
	}
	if coords {
		b.WriteString(`<COOSYS ID="icrs" system="ICRS"/>` + "\n")
	}
	if times {
		b.WriteString(`<TIMESYS ID="utc" timescale="UTC" refposition="TOPOCENTER" timeorigin="MJD-origin"/>` + "\n")
	}
	b.WriteString(`<RESOURCE type="results">` + "\n")
	element(b, "DESCRIPTION", d.About)
	for _, i := range d.Infos {
		fmt.Fprintf(b, "<INFO name=%s value=%s/>\n", attribute(i.Name), attribute(i.Value))
	}
	fmt.Fprintf(b, "<TABLE name=%s", attribute(d.Table.Name))
	if d.Table.Utype != "" {
		fmt.Fprintf(b, " utype=%s", attribute(d.Table.Utype))
	}
	fmt.Fprintf(b, " nrows=\"%d\">\n", len(d.Table.Rows))
	element(b, "DESCRIPTION", d.Table.About)
	for i := range d.Table.Columns {
		field(b, &d.Table, i)
	}
	b.WriteString("<DATA><TABLEDATA>\n")
	for _, row := range d.Table.Rows {
		b.WriteString("<TR>")
		for i, cell := range row {
			b.WriteString("<TD>")
			if cell != nil {
				if err := xml.EscapeText(b, []byte(votableCell(&d.Table.Columns[i], cell))); err != nil {
					return err
				}
			}
			b.WriteString("</TD>")
		}
		b.WriteString("</TR>\n")
	}
	b.WriteString("</TABLEDATA></DATA>\n</TABLE>\n")
	for _, i := range d.After {
		fmt.Fprintf(b, "<INFO name=%s value=%s/>\n", attribute(i.Name), attribute(i.Value))
	}
	b.WriteString("</RESOURCE>\n</VOTABLE>\n")
	return b.Flush()
}

// frame is the ID of the system that a column refers to.
func (c *Column) frame() string {
	switch {
	case c.Kind == Instant || c.Time:
		return "utc"
	case strings.HasPrefix(c.UCD, "pos.eq.") || c.Kind == Ring:
		return "icrs"
	}
	return ""
}

func field(b *bufio.Writer, t *Table, i int) {
	c := t.Columns[i]
	kind, size, unit, xtype := "char", "*", c.Unit, ""
	switch c.Kind {
	case Integer:
		kind, size = "long", ""
	case Real:
		kind, size = "double", ""
	case Truth:
		kind, size = "boolean", ""
	case Instant:
		kind, size, unit = "double", "", "d"
	case Date:
		size = "10"
	case Ring:
		kind, size, xtype = "double", "3", "circle"
	case Text:
		for _, row := range t.Rows {
			if s, ok := row[i].(string); ok && !ascii(s) {
				kind = "unicodeChar"
				break
			}
		}
	}
	fmt.Fprintf(b, "<FIELD name=%s datatype=%q", attribute(c.Name), kind)
	for _, a := range [][2]string{{"arraysize", size}, {"unit", unit}, {"ucd", c.UCD}, {"utype", c.Utype}, {"xtype", xtype}, {"ref", c.frame()}} {
		if a[1] != "" {
			fmt.Fprintf(b, " %s=%s", a[0], attribute(a[1]))
		}
	}
	if c.About == "" {
		b.WriteString("/>\n")
		return
	}
	b.WriteString(">")
	element(b, "DESCRIPTION", c.About)
	b.WriteString("</FIELD>\n")
}

func ascii(s string) bool {
	for i := range len(s) {
		if s[i] >= 0x80 {
			return false
		}
	}
	return true
}

// votableCell writes one cell that is not null.
func votableCell(c *Column, cell any) string {
	switch x := cell.(type) {
	case string:
		return x
	case bool:
		return strconv.FormatBool(x)
	case int32:
		return tables.Date(x)
	case int64:
		if c.Kind == Instant {
			return tables.Float(MJD(x))
		}
		return strconv.FormatInt(x, 10)
	case float64:
		return votableFloat(x)
	case []float64:
		words := make([]string, len(x))
		for i := range x {
			words[i] = votableFloat(x[i])
		}
		return strings.Join(words, " ")
	}
	return fmt.Sprint(cell)
}

func votableFloat(x float64) string {
	switch {
	case math.IsNaN(x):
		return "NaN"
	case math.IsInf(x, 1):
		return "+Inf"
	case math.IsInf(x, -1):
		return "-Inf"
	}
	return tables.Float(x)
}

func element(b *bufio.Writer, name, text string) {
	if text == "" {
		return
	}
	fmt.Fprintf(b, "<%s>", name)
	_ = xml.EscapeText(b, []byte(text)) // the writer keeps its first error for Flush
	fmt.Fprintf(b, "</%s>\n", name)
}

func attribute(s string) string {
	var b strings.Builder
	b.WriteByte('"')
	_ = xml.EscapeText(&b, []byte(s)) // a Builder takes everything
	b.WriteByte('"')
	return b.String()
}
