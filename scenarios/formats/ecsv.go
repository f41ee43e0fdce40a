package formats

import (
	"bufio"
	"bytes"
	"encoding/csv"
	"encoding/json"
	"fmt"
	"io"
	"strconv"
	"strings"

	"nightwright/scheduler/tables"
)

// WriteECSV writes a table as ECSV 1.0 with commas: a YAML head in comment
// lines, then CSV. Instants are ISO 8601 text with Z, as in the plain CSV;
// null is an empty cell.
func WriteECSV(w io.Writer, t Table, infos []Info) error {
	b := bufio.NewWriterSize(w, 1<<16)
	b.WriteString("# %ECSV 1.0\n# ---\n# delimiter: ','\n# datatype:\n")
	for _, c := range t.Columns {
		kind := "string"
		switch c.Kind {
		case Integer:
			kind = "int64"
		case Real:
			kind = "float64"
		case Truth:
			kind = "bool"
		case Ring:
			return fmt.Errorf("%s: the column %s holds circles, which ECSV is not written with", t.Name, c.Name)
		}
		fmt.Fprintf(b, "# - {name: %s, datatype: %s", yamlText(c.Name), kind)
		if c.Unit != "" {
			fmt.Fprintf(b, ", unit: %s", yamlText(c.Unit))
		}
		if c.About != "" {
			fmt.Fprintf(b, ", description: %s", yamlText(c.About))
		}
		if c.UCD != "" {
			fmt.Fprintf(b, ", meta: {ucd: %s}", yamlText(c.UCD))
		}
		b.WriteString("}\n")
	}
	b.WriteString("# meta:\n")
	for _, i := range append([]Info{{"table", t.Name}, {"description", t.About}}, infos...) {
		fmt.Fprintf(b, "#   %s: %s\n", yamlText(i.Name), yamlText(i.Value))
	}
	b.WriteString("# schema: astropy-2.0\n")
	cw := csv.NewWriter(b)
	record := make([]string, len(t.Columns))
	for i, c := range t.Columns {
		record[i] = c.Name
	}
	if err := cw.Write(record); err != nil {
		return err
	}
	for _, row := range t.Rows {
		for i, cell := range row {
			record[i] = ecsvCell(&t.Columns[i], cell)
		}
		if err := cw.Write(record); err != nil {
			return err
		}
	}
	cw.Flush()
	if err := cw.Error(); err != nil {
		return err
	}
	return b.Flush()
}

func ecsvCell(c *Column, cell any) string {
	switch x := cell.(type) {
	case nil:
		return ""
	case string:
		return x
	case bool:
		if x {
			return "True"
		}
		return "False"
	case int32:
		return tables.Date(x)
	case int64:
		if c.Kind == Instant {
			return tables.Instant(x)
		}
		return strconv.FormatInt(x, 10)
	case float64:
		// Python reads nan, inf and -inf.
		return strings.ToLower(strings.TrimPrefix(votableFloat(x), "+"))
	}
	return fmt.Sprint(cell)
}

// yamlText writes a text as a double-quoted YAML scalar, whose escapes are
// those of JSON.
func yamlText(s string) string {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	if err := e.Encode(s); err != nil {
		return `""` // no string fails
	}
	return strings.TrimSuffix(b.String(), "\n")
}
