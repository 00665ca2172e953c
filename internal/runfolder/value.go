package runfolder

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"reflect"
	"slices"
	"strings"
)

// A Value is a number or a complex number. Whether it is complex is a matter
// of what was observed, not of the value: <b_i> is complex also where its
// imaginary part vanishes.
type Value struct {
	Re, Im  float64
	Complex bool
}

// Number returns a real value.
func Number(x float64) Value { return Value{Re: x} }

// Pair returns a complex value.
func Pair(z complex128) Value { return Value{real(z), imag(z), true} }

// MarshalJSON writes a number or [re, im].
func (v Value) MarshalJSON() ([]byte, error) {
	if !v.Complex {
		return json.Marshal(v.Re)
	}
	return json.Marshal([2]float64{v.Re, v.Im})
}

// UnmarshalJSON reads a number or [re, im].
func (v *Value) UnmarshalJSON(text []byte) error {
	*v = Value{}
	if text[0] != '[' {
		return json.Unmarshal(text, &v.Re)
	}
	var parts []float64
	if err := json.Unmarshal(text, &parts); err != nil {
		return err
	}
	if len(parts) != 2 {
		return fmt.Errorf("a value of %d parts: want a number or [re, im]", len(parts))
	}
	*v = Value{parts[0], parts[1], true}
	return nil
}

// At holds the values of a formula's free indices: numbers (int) and leg names
// (string).
type At map[string]any

// MarshalJSON writes an object, {} for none.
func (a At) MarshalJSON() ([]byte, error) {
	if a == nil {
		return []byte("{}"), nil
	}
	for name, v := range a {
		switch v.(type) {
		case int, string:
		default:
			return nil, fmt.Errorf("index %q is a %T: want int or string", name, v)
		}
	}
	return json.Marshal(map[string]any(a))
}

// UnmarshalJSON reads whole numbers as int.
func (a *At) UnmarshalJSON(text []byte) error {
	var raw map[string]any
	d := json.NewDecoder(bytes.NewReader(text))
	d.UseNumber()
	if err := d.Decode(&raw); err != nil {
		return err
	}
	*a = At{}
	for name, v := range raw {
		switch v := v.(type) {
		case string:
			(*a)[name] = v
		case json.Number:
			n, err := v.Int64()
			if err != nil {
				return fmt.Errorf("index %q is %s: want a whole number", name, v)
			}
			(*a)[name] = int(n)
		default:
			return fmt.Errorf("index %q is a %T: want a whole number or a name", name, v)
		}
	}
	return nil
}

// A NotFiniteError names a number that cannot be written.
type NotFiniteError struct {
	Field string // states[0].energy
	Value float64
}

func (e *NotFiniteError) Error() string {
	return fmt.Sprintf("%s is %v: only finite numbers are written", e.Field, e.Value)
}

// checkFinite walks a document and returns a [*NotFiniteError] for the first
// number that JSON cannot hold.
func checkFinite(v any) error { return walkFinite("", reflect.ValueOf(v)) }

func walkFinite(field string, v reflect.Value) error {
	switch v.Kind() {
	case reflect.Float64:
		if x := v.Float(); math.IsNaN(x) || math.IsInf(x, 0) {
			return &NotFiniteError{strings.TrimPrefix(field, "."), x}
		}
	case reflect.Pointer, reflect.Interface:
		if !v.IsNil() {
			return walkFinite(field, v.Elem())
		}
	case reflect.Slice, reflect.Array:
		for i := range v.Len() {
			if err := walkFinite(fmt.Sprintf("%s[%d]", field, i), v.Index(i)); err != nil {
				return err
			}
		}
	case reflect.Map:
		keys := v.MapKeys()
		slices.SortFunc(keys, func(a, b reflect.Value) int { return strings.Compare(a.String(), b.String()) })
		for _, key := range keys {
			if err := walkFinite(fmt.Sprintf("%s[%q]", field, key.String()), v.MapIndex(key)); err != nil {
				return err
			}
		}
	case reflect.Struct:
		if value, ok := v.Interface().(Value); ok {
			return walkFinite(field, reflect.ValueOf([]float64{value.Re, value.Im}))
		}
		for i := range v.NumField() {
			name, _, _ := strings.Cut(v.Type().Field(i).Tag.Get("json"), ",")
			if name == "" || name == "-" {
				continue
			}
			if err := walkFinite(field+"."+name, v.Field(i)); err != nil {
				return err
			}
		}
	}
	return nil
}
