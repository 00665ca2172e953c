package runfolder

import (
	"bytes"
	_ "embed" // the schema
	"encoding/json"
	"fmt"
	"io"
	"math"
	"reflect"
	"slices"
	"strings"
)

//go:embed result.schema.json
var resultSchema []byte

// Schema returns the JSON Schema (draft 2020-12) of result.json.
func Schema() []byte { return bytes.Clone(resultSchema) }

// Validate checks a document against the schema of result.json. The error
// names the first place that breaks it.
func Validate(document []byte) error {
	schema, err := decodeJSON(resultSchema)
	if err != nil {
		return fmt.Errorf("the schema itself: %w", err)
	}
	value, err := decodeJSON(document)
	if err != nil {
		return err
	}
	return validator{schema.(map[string]any)}.check("", schema, value)
}

func decodeJSON(text []byte) (any, error) {
	d := json.NewDecoder(bytes.NewReader(text))
	var v any
	if err := d.Decode(&v); err != nil {
		return nil, fmt.Errorf("no JSON: %w", err)
	}
	if _, err := d.Token(); err != io.EOF {
		return nil, fmt.Errorf("no JSON: text after the document")
	}
	return v, nil
}

// A validator knows the keywords that our schema uses; any other keyword in
// the schema is an error, so that none is taken for checked.
type validator struct{ root map[string]any }

func (v validator) check(place string, schema, value any) error {
	rules, ok := schema.(map[string]any)
	if !ok {
		return fmt.Errorf("schema at %s is no object", at(place))
	}
	for _, keyword := range sortedKeys(rules) {
		if err := v.rule(place, keyword, rules, value); err != nil {
			return err
		}
	}
	return nil
}

func (v validator) rule(place, keyword string, rules map[string]any, value any) error {
	rule := rules[keyword]
	switch keyword {
	case "$schema", "$id", "$defs", "title", "description":
		return nil
	case "$ref":
		name, ok := strings.CutPrefix(rule.(string), "#/$defs/")
		defs, _ := v.root["$defs"].(map[string]any)
		if !ok || defs[name] == nil {
			return fmt.Errorf("schema refers to %q", rule)
		}
		return v.check(place, defs[name], value)
	case "type":
		return checkType(place, rule, value)
	case "const":
		if !reflect.DeepEqual(rule, value) {
			return fmt.Errorf("%s is %v: want %v", at(place), show(value), show(rule))
		}
	case "enum":
		if !slices.ContainsFunc(rule.([]any), func(x any) bool { return reflect.DeepEqual(x, value) }) {
			return fmt.Errorf("%s is %s: want one of %s", at(place), show(value), show(rule))
		}
	case "oneOf":
		return v.oneOf(place, rule.([]any), value)
	case "minimum":
		if x, ok := value.(float64); ok && x < rule.(float64) {
			return fmt.Errorf("%s is %v: want at least %v", at(place), x, rule)
		}
	case "minLength":
		if s, ok := value.(string); ok && float64(len(s)) < rule.(float64) {
			return fmt.Errorf("%s is %q: want at least %v characters", at(place), s, rule)
		}
	case "minItems", "maxItems":
		list, ok := value.([]any)
		n := float64(len(list))
		if ok && (keyword == "minItems" && n < rule.(float64) || keyword == "maxItems" && n > rule.(float64)) {
			return fmt.Errorf("%s has %v entries: %s is %v", at(place), n, keyword, rule)
		}
	case "items":
		list, _ := value.([]any)
		for i, x := range list {
			if err := v.check(fmt.Sprintf("%s[%d]", place, i), rule, x); err != nil {
				return err
			}
		}
	case "required", "properties", "additionalProperties":
		object, ok := value.(map[string]any)
		if !ok {
			return nil
		}
		return v.object(place, keyword, rules, object)
	default:
		return fmt.Errorf("schema uses the keyword %q, which is not checked", keyword)
	}
	return nil
}

func (v validator) object(place, keyword string, rules, object map[string]any) error {
	properties, _ := rules["properties"].(map[string]any)
	switch keyword {
	case "required":
		for _, name := range rules["required"].([]any) {
			if _, ok := object[name.(string)]; !ok {
				return fmt.Errorf("%s lacks %q", at(place), name)
			}
		}
	case "properties":
		for _, name := range sortedKeys(properties) {
			if x, ok := object[name]; ok {
				if err := v.check(place+"."+name, properties[name], x); err != nil {
					return err
				}
			}
		}
	case "additionalProperties":
		for _, name := range sortedKeys(object) {
			if properties[name] != nil {
				continue
			}
			if rules[keyword] == false {
				return fmt.Errorf("%s has an unknown %q", at(place), name)
			}
			if err := v.check(fmt.Sprintf("%s[%q]", place, name), rules[keyword], object[name]); err != nil {
				return err
			}
		}
	}
	return nil
}

func (v validator) oneOf(place string, choices []any, value any) error {
	matches := 0
	var last error
	for _, choice := range choices {
		if err := v.check(place, choice, value); err != nil {
			last = err
		} else {
			matches++
		}
	}
	if matches == 1 {
		return nil
	}
	return fmt.Errorf("%s is %s, which fits %d of %d choices, want one (%w)", at(place), show(value), matches, len(choices), last)
}

func checkType(place string, rule, value any) error {
	names, ok := rule.([]any)
	if !ok {
		names = []any{rule}
	}
	have := "null"
	switch x := value.(type) {
	case bool:
		have = "boolean"
	case string:
		have = "string"
	case []any:
		have = "array"
	case map[string]any:
		have = "object"
	case float64:
		have = "number"
		if x == math.Trunc(x) {
			have = "integer"
		}
	}
	if slices.Contains(names, any(have)) || have == "integer" && slices.Contains(names, any("number")) {
		return nil
	}
	return fmt.Errorf("%s is %s: want %s", at(place), show(value), show(rule))
}

func at(place string) string {
	if place == "" {
		return "the document"
	}
	return strings.TrimPrefix(place, ".")
}

// show writes a value as JSON, cut to a line.
func show(value any) string {
	text, err := json.Marshal(value)
	if err != nil {
		return fmt.Sprint(value)
	}
	if len(text) > 60 {
		return string(text[:57]) + "..."
	}
	return string(text)
}

func sortedKeys[V any](m map[string]V) []string {
	keys := make([]string, 0, len(m))
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}
