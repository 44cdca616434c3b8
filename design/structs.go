package design

import (
	"fmt"
	"reflect"
	"strings"
	"time"
)

// FromStructs makes a table of a slice of structs, or of pointers to structs:
// one row per element, one column per exported field, in the order of the
// fields. The tag `trammel:"hold"` names the column hold instead of by the
// field's name, and `trammel:"-"` leaves the field out. Fields of an embedded
// struct without a tag are taken as if they stood in its place; two columns of
// one name are refused.
//
// Integers and floats become numbers (integers beyond 2^53 are rounded to the
// nearest float64), bool becomes true/false, string becomes text; named types
// of these kinds likewise. A nil pointer to any of them, and a Null value of
// database/sql that is not valid, is a missing cell. Dates and durations are
// refused, for they have no unit: pass days or hours as a number. An empty
// slice gives a table without rows, which serves prediction of nothing. The
// slice is not kept.
func FromStructs(slice any) (*Table, error) {
	v := reflect.ValueOf(slice)
	if !v.IsValid() || v.Kind() != reflect.Slice && v.Kind() != reflect.Array {
		return nil, notASlice(slice)
	}
	row := v.Type().Elem()
	pointers := row.Kind() == reflect.Pointer
	if pointers {
		row = row.Elem()
	}
	if row.Kind() != reflect.Struct || row == timeType {
		return nil, notASlice(slice)
	}
	if pointers {
		for i := range v.Len() {
			if v.Index(i).IsNil() {
				return nil, &Error{
					Code:    codeNilElement,
					Message: fmt.Sprintf("row %d is a nil pointer", i+1),
					Hint:    "leave it out, or point it at a struct whose pointer fields are nil where cells are missing",
					Rows:    []int{i + 1},
				}
			}
		}
	}
	fields, err := structFields(row, nil, nil)
	if err != nil {
		return nil, err
	}
	if err := tooManyColumns(len(fields)); err != nil {
		return nil, err
	}
	cols := make([]*column, len(fields))
	for j, f := range fields {
		cols[j] = &column{name: f.name}
	}
	if err := checkNames(cols, 0, "name one of the fields anew by a tag: `trammel:\"name\"`"); err != nil {
		return nil, err
	}
	for j, f := range fields {
		if cols[j], err = f.read(v, pointers); err != nil {
			return nil, err
		}
	}
	return assemble(v.Len(), cols), nil
}

func notASlice(got any) *Error {
	what := "nil"
	if got != nil {
		what = "a " + reflect.TypeOf(got).String()
	}
	return &Error{
		Code:    codeNotASlice,
		Message: "FromStructs was given " + what,
		Hint:    "give it a slice of structs, such as []Reading",
	}
}

// A structField is one field that becomes a column.
type structField struct {
	name    string // of the column
	index   []int  // path through embedded structs
	kind    Kind
	scalar  reflect.Kind
	pointer bool // a pointer to the value; nil is missing
	null    bool // a Null struct of database/sql: value and Valid
}

// structFields lists the fields that become columns, with those of embedded
// structs in their place.
func structFields(t reflect.Type, path []int, fields []structField) ([]structField, *Error) {
	for i := range t.NumField() {
		sf := t.Field(i)
		tag, tagged := sf.Tag.Lookup("trammel")
		if tag == "-" {
			continue
		}
		index := append(path[:len(path):len(path)], i)
		if sf.Anonymous && !tagged && sf.Type.Kind() == reflect.Struct && sf.Type != timeType && !isNull(sf.Type) {
			var err *Error
			if fields, err = structFields(sf.Type, index, fields); err != nil {
				return nil, err
			}
			continue
		}
		if !sf.IsExported() {
			if err := hiddenField(sf, tagged); err != nil {
				return nil, err
			}
			continue
		}
		f := structField{name: sf.Name, index: index}
		if tag != "" {
			f.name = tag
		}
		if err := f.classify(sf); err != nil {
			return nil, err
		}
		fields = append(fields, f)
	}
	return fields, nil
}

// hiddenField passes over a field that is not exported, unless that would lose
// something the caller counts on: a tag, or the fields of an embedded pointer.
func hiddenField(sf reflect.StructField, tagged bool) *Error {
	err := &Error{Code: codeUnsupportedType, Names: []string{sf.Name}}
	switch {
	case tagged:
		err.Message = fmt.Sprintf("field %s has a tag and is not exported, so that it cannot be read", sf.Name)
		err.Hint = "begin its name with a capital letter, or take the tag away"
	case sf.Anonymous && sf.Type.Kind() == reflect.Pointer:
		err.Message = fmt.Sprintf("the embedded field %s is a pointer", sf.Name)
		err.Hint = "embed the struct itself, or leave it out by the tag `trammel:\"-\"`"
	default:
		return nil
	}
	return err
}

var (
	timeType     = reflect.TypeFor[time.Time]()
	durationType = reflect.TypeFor[time.Duration]()
)

// isNull reports whether t is one of database/sql's Null structs, the generic
// one included: a value and whether it is valid.
func isNull(t reflect.Type) bool {
	return t.Kind() == reflect.Struct && t.PkgPath() == "database/sql" && strings.HasPrefix(t.Name(), "Null") &&
		t.NumField() == 2 && t.Field(1).Name == "Valid" && t.Field(1).Type.Kind() == reflect.Bool
}

// classify tells the kind of column from the field's type.
func (f *structField) classify(sf reflect.StructField) *Error {
	t := sf.Type
	if t.Kind() == reflect.Pointer {
		f.pointer = true
		t = t.Elem()
	}
	if isNull(t) {
		f.null = true
		t = t.Field(0).Type
	}
	switch {
	case t == timeType:
		return dateColumn("field "+sf.Name, f.name, sf.Type.String())
	case t == durationType:
		return &Error{
			Code:    codeUnsupportedType,
			Message: fmt.Sprintf("field %s is a %v, which has no unit", sf.Name, sf.Type),
			Hint:    "pass seconds or hours as a number, or leave the field out by the tag `trammel:\"-\"`",
			Names:   []string{f.name},
		}
	}
	f.scalar = t.Kind()
	kind, ok := scalarKind(f.scalar)
	if !ok {
		return &Error{
			Code:    codeUnsupportedType,
			Message: fmt.Sprintf("field %s is a %v; a column holds numbers, true/false or text", sf.Name, sf.Type),
			Hint:    "change its type, or leave the field out by the tag `trammel:\"-\"`",
			Names:   []string{f.name},
		}
	}
	f.kind = kind
	return nil
}

// scalarKind tells the kind of column that a Go kind gives.
func scalarKind(k reflect.Kind) (kind Kind, ok bool) {
	switch {
	case k == reflect.Bool:
		return BoolColumn, true
	case k == reflect.String:
		return TextColumn, true
	case isSigned(k), isUnsigned(k), k == reflect.Float32, k == reflect.Float64:
		return NumberColumn, true
	}
	return NumberColumn, false
}

func isSigned(k reflect.Kind) bool { return k >= reflect.Int && k <= reflect.Int64 }

func isUnsigned(k reflect.Kind) bool { return k >= reflect.Uint && k <= reflect.Uintptr }

// dateColumn refuses dates; place says where they stand.
func dateColumn(place, name, typ string) *Error {
	return &Error{
		Code:    codeDateColumn,
		Message: fmt.Sprintf("%s holds dates or times (%s)", place, typ),
		Hint:    "pass days as a number",
		Names:   []string{name},
	}
}

// read makes the column of one field.
func (f *structField) read(rows reflect.Value, pointers bool) (*column, *Error) {
	b := newBuilder(f.name)
	b.room = rows.Len()
	b.become(f.kind)
	for i := range rows.Len() {
		v := rows.Index(i)
		if pointers {
			v = v.Elem()
		}
		v = v.FieldByIndex(f.index)
		if f.pointer {
			if v.IsNil() {
				b.addMissing()
				continue
			}
			v = v.Elem()
		}
		if f.null {
			if !v.Field(1).Bool() {
				b.addMissing()
				continue
			}
			v = v.Field(0)
		}
		b.addValue(v)
	}
	return b.finish()
}

// addValue adds a value whose Go kind belongs to the builder's kind.
func (b *builder) addValue(v reflect.Value) {
	switch b.kind {
	case BoolColumn:
		b.addBool(v.Bool())
	case TextColumn:
		b.addText(v.String())
	default:
		switch k := v.Kind(); {
		case isSigned(k):
			b.addNumber(float64(v.Int()))
		case isUnsigned(k):
			b.addNumber(float64(v.Uint()))
		default:
			b.addNumber(v.Float())
		}
	}
}
