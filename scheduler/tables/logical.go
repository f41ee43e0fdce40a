package tables

import (
	"errors"
	"fmt"
	"math/big"
	"strconv"
	"time"

	"github.com/parquet-go/parquet-go"
	"github.com/parquet-go/parquet-go/format"
)

// logicalReader reads the logical types that a flat list may hold. known is
// false where the physical type tells enough.
func logicalReader(l *format.LogicalType) (cr cellReader, known bool, err error) {
	switch t := l.Value.(type) {
	case *format.DateType:
		return cellReader{text: func(v parquet.Value) string { return Date(v.Int32()) }}, true, nil
	case *format.TimestampType:
		if !t.IsAdjustedToUTC {
			return cr, true, errors.New("holds local times without a zone; want instants in UTC")
		}
		if t.Unit.Value == nil {
			return cr, true, errors.New("holds instants of no known unit; want ms, us or ns")
		}
		unit := int64(t.Unit.Value.Duration())
		return cellReader{text: func(v parquet.Value) string { return instantOf(v.Int64(), unit) }}, true, nil
	case *format.IntType:
		if !t.IsSigned && t.BitWidth == 64 {
			return cellReader{number: func(v parquet.Value) float64 { return float64(v.Uint64()) }}, true, nil
		}
		if !t.IsSigned {
			return cellReader{number: func(v parquet.Value) float64 { return float64(v.Uint32()) }}, true, nil
		}
		return cr, false, nil
	case *format.StringType, *format.EnumType:
		return cr, false, nil
	case *format.DecimalType:
		return decimalReader(t.Scale), true, nil
	default:
		return cr, true, fmt.Errorf("holds %s; want text, numbers, true or false, dates or instants", l)
	}
}

// instantOf writes an instant counted in units of so many ns.
func instantOf(n, unit int64) string {
	perSecond := int64(time.Second) / unit
	sec, rest := n/perSecond, n%perSecond
	if rest < 0 {
		sec, rest = sec-1, rest+perSecond
	}
	return time.Unix(sec, rest*unit).UTC().Format(time.RFC3339Nano)
}

// decimalReader reads integers that stand for decimals of a scale, by way of
// text, so that 12.34 comes out as the float64 nearest to 12.34.
func decimalReader(scale int32) cellReader {
	return cellReader{number: func(v parquet.Value) float64 {
		var n big.Int
		switch v.Kind() {
		case parquet.Int32:
			n.SetInt64(int64(v.Int32()))
		case parquet.Int64:
			n.SetInt64(v.Int64())
		default: // big-endian two's complement of any length
			b := v.ByteArray()
			n.SetBytes(b)
			if len(b) > 0 && b[0] >= 0x80 {
				n.Sub(&n, new(big.Int).Lsh(big.NewInt(1), 8*uint(len(b))))
			}
		}
		x, _ := strconv.ParseFloat(fmt.Sprintf("%de%d", &n, -scale), 64)
		return x
	}}
}
