package dmrg

import (
	"bytes"
	"encoding/json"
	"fmt"
)

// named is a field of a structure that journals hold, by its name there.
type named struct {
	name string
	at   any // pointer to it
}

// marshalFields writes fields as a JSON object. Numbers keep all their bits.
func marshalFields(fields []named) ([]byte, error) {
	var b bytes.Buffer
	b.WriteByte('{')
	for i, f := range fields {
		text, err := json.Marshal(f.at)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", f.name, err)
		}
		if i > 0 {
			b.WriteByte(',')
		}
		fmt.Fprintf(&b, "%q:%s", f.name, text)
	}
	b.WriteByte('}')
	return b.Bytes(), nil
}

// unmarshalFields reads what marshalFields wrote, of the same fields.
func unmarshalFields(text []byte, fields []named) error {
	var object map[string]json.RawMessage
	if err := json.Unmarshal(text, &object); err != nil {
		return err
	}
	if len(object) != len(fields) {
		return fmt.Errorf("an object of %d fields; expected %d", len(object), len(fields))
	}
	for _, f := range fields {
		if err := json.Unmarshal(object[f.name], f.at); err != nil {
			return fmt.Errorf("field %q: %w", f.name, err)
		}
	}
	return nil
}

func (s *setting) fields() []named {
	return []named{{"bond", &s.bond}, {"weight", &s.weight}, {"perturbation", &s.perturbation}, {"noise", &s.noise}, {"vectors", &s.vectors},
		{"tolerance", &s.tolerance}, {"least", &s.least}, {"update", &s.update}, {"passing", &s.passing}}
}

func (s setting) MarshalJSON() ([]byte, error)     { return marshalFields(s.fields()) }
func (s *setting) UnmarshalJSON(text []byte) error { return unmarshalFields(text, s.fields()) }

func (o *outcome) fields() []named {
	return []named{{"energy", &o.energy}, {"discarded", &o.discarded}, {"total", &o.total}, {"largest", &o.largest}, {"residual", &o.residual}, {"rest", &o.rest},
		{"narrow", &o.narrow}, {"gain", &o.gain}, {"change", &o.change}, {"products", &o.products}, {"flops", &o.flops}, {"seconds", &o.seconds}}
}

func (o outcome) MarshalJSON() ([]byte, error)     { return marshalFields(o.fields()) }
func (o *outcome) UnmarshalJSON(text []byte) error { return unmarshalFields(text, o.fields()) }

func (w *passage) fields() []named {
	return []named{{"left", &w.left}, {"next", &w.next}, {"out", &w.out}}
}

func (w passage) MarshalJSON() ([]byte, error)     { return marshalFields(w.fields()) }
func (w *passage) UnmarshalJSON(text []byte) error { return unmarshalFields(text, w.fields()) }
