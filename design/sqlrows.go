package design

import (
	"database/sql"
	"fmt"
	"reflect"
	"strings"
	"time"
)

// FromRows makes a table of what a query gives: it reads rows to the end of
// the current result set, one row per row and one column per column. It does
// not close rows; that stays with the caller, who deferred rows.Close().
//
// NULL is a missing cell. Integers, floats, booleans and texts become numbers,
// true/false and text; bytes are text, as drivers give it, except where the
// driver names the column's type as a number (NUMERIC, BIGINT and the like):
// there they are read as a number. A column whose cells are all NULL is a
// number column. Dates and times are refused: let the query give days as a
// number. A query column with cells of different kinds, two columns of one
// name, a column without a name, and a result without rows are refused, each
// by an [*Error]; an error of the driver is wrapped in one.
func FromRows(rows *sql.Rows) (*Table, error) {
	if rows == nil {
		return nil, &Error{Code: codeReadFailed, Message: "rows is nil", Hint: "check the error of the query first"}
	}
	names, failure := rows.Columns()
	if failure != nil {
		return nil, queryFailed(failure)
	}
	if err := tooManyColumns(len(names)); err != nil {
		return nil, err
	}
	named := make([]*column, len(names))
	for j, name := range names {
		named[j] = &column{name: name}
	}
	if err := checkNames(named, 0, "name it in the query: SELECT … AS name"); err != nil {
		return nil, err
	}
	types, failure := rows.ColumnTypes()
	if failure != nil {
		return nil, queryFailed(failure)
	}
	cols := make([]*sqlColumn, len(names))
	cells := make([]any, len(names))
	into := make([]any, len(names))
	for j, name := range names {
		cols[j] = &sqlColumn{builder: *newBuilder(name), declared: declared(types[j].DatabaseTypeName())}
		into[j] = &cells[j]
	}
	n := 0
	for rows.Next() {
		if failure := rows.Scan(into...); failure != nil {
			return nil, queryFailed(failure)
		}
		n++
		for j, c := range cols {
			if err := c.add(cells[j]); err != nil {
				return nil, err
			}
		}
	}
	if failure := rows.Err(); failure != nil {
		return nil, queryFailed(failure)
	}
	if n == 0 {
		return nil, &Error{Code: codeNoRows, Message: "the query gives no rows", Hint: "check its conditions"}
	}
	made := make([]*column, len(cols))
	for j, c := range cols {
		var err *Error
		if made[j], err = c.finish(); err != nil {
			return nil, err
		}
	}
	return assemble(n, made), nil
}

func queryFailed(cause error) *Error {
	return readFailed("reading the query's rows failed", cause)
}

// A sqlColumn is a builder fed with the values a driver gives.
type sqlColumn struct {
	builder
	declared sqlType
}

// A sqlType is what the driver's name of a column's type says about texts in it.
type sqlType uint8

const (
	saysNothing sqlType = iota
	saysNumber
	saysDate
)

// declared reads the name of a type: the numeric and datetime types of ISO/IEC
// 9075-2 (SQL), section 6.1, and the short numeric names that are common
// beside them. Precision in parentheses, UNSIGNED and the like do not matter.
func declared(name string) sqlType {
	words := strings.FieldsFunc(strings.ToUpper(name), func(r rune) bool { return r == ' ' || r == '(' })
	for len(words) > 0 && (words[0] == "UNSIGNED" || words[0] == "SIGNED") {
		words = words[1:]
	}
	if len(words) == 0 {
		return saysNothing
	}
	switch words[0] {
	case "NUMERIC", "DECIMAL", "DEC", "DECFLOAT", "NUMBER", "SMALLINT", "INTEGER", "INT", "BIGINT",
		"TINYINT", "MEDIUMINT", "INT2", "INT4", "INT8", "FLOAT", "FLOAT4", "FLOAT8", "REAL", "DOUBLE":
		return saysNumber
	case "DATE", "TIME", "DATETIME", "TIMESTAMP", "TIMETZ", "TIMESTAMPTZ", "INTERVAL":
		return saysDate
	}
	return saysNothing
}

// add takes the next value of the column.
func (c *sqlColumn) add(value any) *Error {
	switch v := value.(type) {
	case nil:
		c.addMissing()
		return nil
	case time.Time:
		return c.date("time.Time")
	case []byte:
		return c.addTextual(string(v))
	case string:
		return c.addTextual(v)
	}
	v := reflect.ValueOf(value)
	kind, ok := scalarKind(v.Kind())
	if !ok || v.Type() == durationType {
		return &Error{
			Code:    codeUnsupportedType,
			Message: fmt.Sprintf("row %d of column %s is a %T; a column holds numbers, true/false or text", c.rows+1, nameText(c.name), value),
			Hint:    "cast it in the query, or leave the column out",
			Names:   []string{c.name}, Rows: []int{c.rows + 1},
		}
	}
	if err := c.settle(kind); err != nil {
		return err
	}
	c.addValue(v)
	return nil
}

// addTextual takes a text, which is a number where the column's type says so.
func (c *sqlColumn) addTextual(s string) *Error {
	switch c.declared {
	case saysDate:
		return c.date("text in a column of a date or time type")
	case saysNumber:
		v, ok := parseQueryNumber(s)
		if !ok {
			return &Error{
				Code:    codeBadCell,
				Message: fmt.Sprintf("row %d of column %s, whose type is a number, holds %s", c.rows+1, nameText(c.name), shown(s)),
				Hint:    "cast it in the query",
				Names:   []string{c.name}, Rows: []int{c.rows + 1},
			}
		}
		if err := c.settle(NumberColumn); err != nil {
			return err
		}
		c.addNumber(v)
		return nil
	}
	if err := c.settle(TextColumn); err != nil {
		return err
	}
	c.addText(s)
	return nil
}

// parseQueryNumber reads a number as databases write it: leading zeros do not
// make it a code, for the type has settled that, and infinity may be spelt out.
func parseQueryNumber(s string) (float64, bool) {
	cell := []byte(s)
	if n := len(cell) - len("infinity"); n >= 0 && foldsTo(cell[n:], "infinity") {
		cell = cell[:n+len("inf")]
	}
	v, class := parseNumeral(cell)
	return v, class != notNumeral
}

func (c *sqlColumn) date(what string) *Error {
	err := dateColumn(fmt.Sprintf("row %d of column %s", c.rows+1, nameText(c.name)), c.name, what)
	err.Hint = "let the query give days as a number"
	err.Rows = []int{c.rows + 1}
	return err
}

// settle takes the kind of a value, which must be that of the values before.
func (c *sqlColumn) settle(kind Kind) *Error {
	if !c.known {
		c.become(kind)
	}
	if c.kind == kind {
		return nil
	}
	return &Error{
		Code:    codeMixedColumn,
		Message: fmt.Sprintf("row %d of column %s holds %s and the rows above it hold %s", c.rows+1, nameText(c.name), kind.cells(), c.kind.cells()),
		Hint:    "cast the column to one type in the query",
		Names:   []string{c.name}, Rows: []int{c.rows + 1},
	}
}
