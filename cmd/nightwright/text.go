package main

import (
	"bufio"
	"encoding/json"
	"fmt"
	"io"
	"os"
	"strconv"
	"strings"
	"time"

	"github.com/jedib0t/go-pretty/v6/table"
	"github.com/jedib0t/go-pretty/v6/text"
)

// pageWidth is how wide a summary may be: a plain terminal.
const pageWidth = 80

// printer writes a result page; the first error of the stream is kept.
type printer struct {
	w      *bufio.Writer
	colour bool
}

func (a *app) printer() *printer {
	return &printer{w: bufio.NewWriter(a.stdout), colour: isTerminal(a.stdout) && os.Getenv("NO_COLOR") == "" && os.Getenv("TERM") != "dumb"}
}

func (p *printer) line(format string, args ...any) {
	fmt.Fprintf(p.w, format, args...)
	p.w.WriteByte('\n')
}

// head writes a heading after a blank line.
func (p *printer) head(format string, args ...any) {
	p.line("")
	p.line("%s", p.bold(fmt.Sprintf(format, args...)))
}

func (p *printer) bold(s string) string  { return p.paint("1", s) }
func (p *printer) green(s string) string { return p.paint("32", s) }
func (p *printer) red(s string) string   { return p.paint("31", s) }

func (p *printer) paint(code, s string) string {
	if !p.colour {
		return s
	}
	return "\x1b[" + code + "m" + s + "\x1b[0m"
}

// list is a table for the terminal. A column whose title starts with "<" is
// set to the left, any other to the right.
type list struct {
	titles []string
	rows   [][]string
}

func newList(titles ...string) *list { return &list{titles: titles} }

func (l *list) add(cells ...string) { l.rows = append(l.rows, cells) }

// bare is a table without its head.
func (p *printer) bare(l *list) { p.render(l, false) }

func (p *printer) table(l *list) { p.render(l, true) }

func (p *printer) render(l *list, titled bool) {
	w := table.NewWriter()
	style := table.StyleDefault
	style.Options = table.Options{SeparateColumns: true}
	style.Box.PaddingLeft, style.Box.PaddingRight, style.Box.MiddleVertical = "", "", "  "
	style.Format = table.FormatOptions{Header: text.FormatDefault}
	w.SetStyle(style)
	head := table.Row{}
	var configs []table.ColumnConfig
	for i, t := range l.titles {
		align := text.AlignRight
		if left, ok := strings.CutPrefix(t, "<"); ok {
			t, align = left, text.AlignLeft
		}
		head = append(head, t)
		configs = append(configs, table.ColumnConfig{Number: i + 1, Align: align, AlignHeader: align})
	}
	if titled {
		w.AppendHeader(head)
	}
	w.SetColumnConfigs(configs)
	for _, r := range l.rows {
		row := make(table.Row, len(r))
		for i, c := range r {
			row[i] = c
		}
		w.AppendRow(row)
	}
	for _, row := range strings.Split(w.Render(), "\n") {
		p.line("  %s", strings.TrimRight(row, " "))
	}
}

func (p *printer) flush() error { return p.w.Flush() }

// json writes a value as indented JSON.
func (a *app) json(v any) error { return writeJSON(a.stdout, v) }

func writeJSON(w io.Writer, v any) error {
	enc := json.NewEncoder(w)
	enc.SetEscapeHTML(false)
	enc.SetIndent("", "  ")
	return enc.Encode(v)
}

// thousands writes 1234567 as 1,234,567.
func thousands(n int) string {
	s := strconv.Itoa(n)
	start := 1
	if n < 0 {
		start = 2
	}
	for i := len(s) - 3; i >= start; i -= 3 {
		s = s[:i] + "," + s[i:]
	}
	return s
}

// hours writes hours with one decimal.
func hours(h float64) string {
	s := strconv.FormatFloat(h, 'f', 1, 64)
	whole, tenth, _ := strings.Cut(s, ".")
	n, err := strconv.Atoi(whole)
	if err != nil {
		return s
	}
	if n == 0 && h < 0 {
		return "-0." + tenth
	}
	return thousands(n) + "." + tenth
}

// percent writes a fraction as percent, "-" when there is nothing to divide by.
func percent(part, whole float64) string {
	if whole == 0 {
		return "-"
	}
	return strconv.FormatFloat(100*part/whole, 'f', 1, 64) + " %"
}

// clip shortens a name to n runes.
func clip(s string, n int) string {
	r := []rune(s)
	if len(r) <= n {
		return s
	}
	return string(r[:n-1]) + "…"
}

// enumerate joins names with commas and an "and".
func enumerate(names []string) string {
	if n := len(names); n > 1 {
		return strings.Join(names[:n-1], ", ") + " and " + names[n-1]
	}
	return strings.Join(names, "")
}

// quote makes a word safe to paste into a shell.
func quote(word string) string {
	const plain = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-_./:+=@%,"
	if word != "" && strings.Trim(word, plain) == "" {
		return word
	}
	return "'" + strings.ReplaceAll(word, "'", `'\''`) + "'"
}

// readable shortens one cell of a table for reading: instants to the second,
// numbers to four decimals.
func readable(column, cell string) string {
	switch {
	case cell == "":
		return "-"
	case strings.HasSuffix(column, "_utc"):
		if t, err := time.Parse(time.RFC3339Nano, cell); err == nil {
			return t.Round(time.Second).Format("2006-01-02 15:04:05")
		}
	case strings.Contains(cell, ".") && !leftColumn(column):
		if x, err := strconv.ParseFloat(cell, 64); err == nil {
			return strconv.FormatFloat(x, 'f', 4, 64)
		}
	}
	return cell
}
