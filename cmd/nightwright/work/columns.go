package work

import (
	"reflect"
	"strings"
)

// form says how a column's text becomes JSON.
type form struct {
	bare     bool // a number or a boolean
	optional bool // no text is null
}

// forms returns the form of each column of a row type: bare unless it is an
// instant, a date or a name.
func forms[T any]() []form {
	t := reflect.TypeFor[T]()
	var out []form
	for i := range t.NumField() {
		f := t.Field(i)
		kind := f.Type.Kind()
		if kind == reflect.Pointer {
			kind = f.Type.Elem().Kind()
		}
		tag := f.Tag.Get("parquet")
		out = append(out, form{
			bare:     kind != reflect.String && !strings.Contains(tag, ",timestamp") && !strings.Contains(tag, ",date"),
			optional: strings.Contains(tag, ",optional"),
		})
	}
	return out
}
