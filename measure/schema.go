package measure

import (
	"bytes"
	"encoding/json"
	"fmt"
	"slices"
	"strings"
	"unicode"

	"drivemend/measure/quantity"
)

// schemaID names the schema; it is no address, nothing is ever fetched by it.
const schemaID = "urn:drivemend:case:1"

// Schema gives the JSON Schema (draft 2020-12) of a case file, made from the key table: every file that loads is valid.
// What only shows in the number behind a unit or between keys (ranges, contradictions, parts that are not on the
// board), and what YAML itself hides (anchors, keys stated twice), is left to the loader; a character without width
// inside a number or unit, and an interval without width behind > or <, load and are refused here. The bytes are the
// same every time, indented, with a line end at the end.
func Schema() []byte {
	root := keyTable().root
	s := object{
		{"$schema", "https://json-schema.org/draft/2020-12/schema"},
		{"$id", schemaID},
		{"title", "case file of drivemend, version 1"},
		{"description", root.Help},
	}
	s = append(s, mapSchema(root, false)...)
	s = append(s, member{"$defs", definitions()})
	var b bytes.Buffer
	// Objects of strings, numbers and lists always marshal and indent.
	_ = json.Indent(&b, marshal(s), "", "  ")
	b.WriteByte('\n')
	return visible(b.Bytes())
}

// object is a JSON object whose members keep their order.
type object []member

// member is one name and value of an object.
type member struct {
	name  string
	value any
}

// MarshalJSON writes the members in order.
func (o object) MarshalJSON() ([]byte, error) {
	var b bytes.Buffer
	b.WriteByte('{')
	for i, m := range o {
		if i > 0 {
			b.WriteByte(',')
		}
		b.Write(marshal(m.name))
		b.WriteByte(':')
		b.Write(marshal(m.value))
	}
	b.WriteByte('}')
	return b.Bytes(), nil
}

// marshal writes a value as JSON with < and > as they are.
func marshal(v any) []byte {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	_ = e.Encode(v) // see Schema
	return bytes.TrimSuffix(b.Bytes(), []byte("\n"))
}

// visible writes characters that cannot be seen as \u escapes.
func visible(raw []byte) []byte {
	var b bytes.Buffer
	for _, r := range string(raw) {
		if r > unicode.MaxASCII && !unicode.IsGraphic(r) {
			fmt.Fprintf(&b, `\u%04x`, r)
			continue
		}
		b.WriteRune(r)
	}
	return b.Bytes()
}

// keySchema gives the schema of what may stand under a key.
func keySchema(r *rung) object {
	head := object{{"title", title(r.Key)}, {"description", describeKey(r.Key)}}
	if at := original(r.Path); at != "" {
		return append(head, member{"$ref", "#" + pointer(at)})
	}
	forms := valueForms(r)
	if len(forms) == 1 {
		return append(head, forms[0]...)
	}
	return append(head, member{"anyOf", forms})
}

// title names a key in an editor: its last word and its unit.
func title(k Key) string {
	name := k.Path[strings.LastIndex(k.Path, ".")+1:]
	if k.Kind == KindQuantity && k.Unit != quantity.Any {
		return name + " (" + string(k.Unit) + ")"
	}
	return name
}

// original gives the key that a key is a copy of: those of a rebuild are the board's, those of a position the
// switch's; "" for a key of its own.
func original(path string) string {
	for _, m := range []struct{ from, to string }{{"rebuild.", "board."}, {"board.positions.*.", "board.switch."}} {
		rest, ok := strings.CutPrefix(path, m.from)
		if r := keyTable().find(m.to + rest); ok && r != nil && rest != "parts" {
			return r.Path
		}
	}
	return ""
}

// pointer gives the place of a key in the schema.
func pointer(path string) string {
	return "/properties/" + strings.ReplaceAll(path, ".", "/properties/")
}

// valueForms gives the forms a value may have, any of them.
func valueForms(r *rung) []object {
	var forms []object
	switch r.Kind {
	case KindMap:
		return []object{mapSchema(r, !anyRequired(r))}
	case KindNamed:
		return []object{namedSchema(r)}
	case KindList:
		return []object{listSchema(r)}
	case KindQuantity:
		forms = []object{ref(unitNames[r.Unit])}
	case KindCount, KindRatio:
		forms = []object{numberSchema(r.Key), ref(unitNames[r.Unit])}
	case KindWord:
		words := r.Words
		if r.MayBeUnknown && !slices.Contains(words, unknown) {
			words = append(slices.Clone(words), unknown)
		}
		return []object{{{"enum", words}}}
	case KindName:
		if r.Form != nil {
			return []object{{{"type", []string{"string", "number"}}, {"pattern", r.Form.Pattern.String()}}}
		}
		return []object{ref("name")}
	default:
		return []object{ref(string(r.Kind))}
	}
	if words := otherWords(r.Key); words != nil {
		forms = append(forms, object{{"enum", words}})
	}
	if len(r.below) > 0 {
		forms = append(forms, mapSchema(r, false))
	}
	return forms
}

// otherWords gives the words that may stand in place of a number.
func otherWords(k Key) []string {
	var out []string
	if slices.Contains(k.Words, "none") {
		out = append(out, "none")
	}
	if k.MayBeUnknown {
		out = append(out, unknown)
	}
	return out
}

// ref points at a definition.
func ref(name string) object { return object{{"$ref", "#/$defs/" + name}} }

// numberSchema is a bare number within its range.
func numberSchema(k Key) object {
	s := object{{"type", "number"}}
	if k.Kind == KindCount {
		s = object{{"type", "integer"}}
	}
	if k.Min != 0 || k.Max != 0 {
		s = append(s, member{"minimum", k.Min}, member{"maximum", k.Max})
	}
	return s
}

// mapSchema is a map of the keys below a rung; empty tells whether nothing may stand in its place.
func mapSchema(r *rung, empty bool) object {
	s := object{{"type", typed("object", empty)}}
	properties := object{}
	for _, name := range r.names {
		properties = append(properties, member{name, keySchema(r.below[name])})
	}
	if required := r.required(); required != nil {
		s = append(s, member{"required", required})
	}
	s = append(s, member{"properties", properties}, member{"additionalProperties", false})
	return append(s, betweenKeys(r)...)
}

// betweenKeys is what holds between the keys of an entry: an observation has one answer, and a condition belongs to its
// step.
func betweenKeys(r *rung) object {
	switch r.Path {
	case "observations[]":
		var one []object
		for _, name := range answerKeys {
			one = append(one, object{{"required", []string{name}}})
		}
		return object{{"oneOf", one}, {"dependentRequired", object{{"twin", []string{"reading"}}}}}
	case "safety.before[]":
		takes := object{}
		for _, name := range r.names {
			if steps := beforeTakes[name]; steps != nil {
				takes = append(takes, member{name, object{{"properties", object{{"step", object{{"enum", steps}}}}}}})
			}
		}
		return object{{"dependentSchemas", takes}}
	}
	return nil
}

// namedSchema is a map whose keys are names of the user's own.
func namedSchema(r *rung) object {
	return object{{"type", typed("object", true)}, {"propertyNames", object{{"pattern", nameShape.String()}}},
		{"additionalProperties", keySchema(r.below["*"])}}
}

// listSchema is a list of names, or of maps.
func listSchema(r *rung) object {
	items := ref("entry")
	if item := r.below["[]"]; item != nil {
		items = mapSchema(item, !anyRequired(item))
	}
	return object{{"type", typed("array", true)}, {"items", items}}
}

// typed gives a type, alone or with nothing in its place.
func typed(kind string, empty bool) any {
	if empty {
		return []string{kind, "null"}
	}
	return kind
}

// unitNames are the names of the definitions of quantities.
var unitNames = map[quantity.Unit]string{
	quantity.Any: "any-unit", quantity.Count: "count", quantity.Ratio: "ratio", quantity.Volt: "volt", quantity.Ampere: "ampere",
	quantity.Ohm: "ohm", quantity.Farad: "farad", quantity.Henry: "henry", quantity.Second: "second", quantity.Hertz: "hertz",
	quantity.Watt: "watt", quantity.Joule: "joule", quantity.Coulomb: "coulomb", quantity.Kelvin: "kelvin", quantity.Celsius: "celsius",
	quantity.KelvinPerWatt: "kelvin-per-watt", quantity.VoltPerSecond: "volt-per-second", quantity.AmperePerSecond: "ampere-per-second",
	quantity.RadianPerSecond: "radian-per-second", quantity.KilogramSqMetre: "kilogram-square-metre", quantity.PerKelvin: "per-kelvin",
	quantity.AmpereHour: "ampere-hour",
}

// definitions are the forms of value that keys share.
func definitions() object {
	scalar := []string{"string", "number", "boolean"}
	figure, word, never := quantity.ReadingPatterns()
	reading := object{{"description", "what an instrument showed"}, {"anyOf", []object{
		{{"type", "boolean"}}, // true and false are words
		{{"type", "string"}, {"pattern", figure}},
		{{"type", "string"}, {"pattern", word}, {"not", object{{"pattern", never}}}},
	}}}
	out := object{
		{string(KindText), object{{"description", "free text"}, {"type", append(slices.Clone(scalar), "null")}}},
		{"name", object{{"description", "one word without blanks"}, {"type", scalar}, {"pattern", `^[^ \t\r\n]+$`}, {"maxLength", longestID}}},
		{"entry", object{{"description", "one name of a list"}, {"type", scalar}, {"pattern", `[^\s\v\x85\p{Z}]`}}},
		{string(KindYesNo), object{{"description", "yes, no or unknown"}, {"anyOf", []object{
			{{"enum", []any{"yes", "no", unknown, true, false}}}, {{"type", "string"}, {"pattern", yesNoForm}}}}}},
		{string(KindTime), object{{"description", "a moment with its offset"}, {"type", "string"}, {"pattern", timeForm}}},
		{string(KindDate), object{{"description", "a day"}, {"type", "string"}, {"pattern", dateForm}}},
		{string(KindReading), reading},
	}
	for _, u := range append([]quantity.Unit{quantity.Any}, quantity.Units()...) {
		if usesUnit(u) {
			out = append(out, member{unitNames[u], object{{"description", unitNames[u]}, {"type", "string"}, {"pattern", quantity.Pattern(u)}}})
		}
	}
	return out
}

// usesUnit tells whether a key of the table has a unit.
func usesUnit(u quantity.Unit) bool {
	return slices.ContainsFunc(keyTable().rows, func(k Key) bool { return k.Unit == u })
}

// The forms of times and yes-no words as the loader reads them.
const (
	outer     = `[\s\v\x85\p{Z}]*` // blanks around a value are cut off
	dayForm   = `(?:(?:0[13578]|1[02])-(?:0[1-9]|[12]\d|3[01])|(?:0[469]|11)-(?:0[1-9]|[12]\d|30)|02-(?:0[1-9]|[12]\d))`
	dateForm  = `^` + outer + `\d{4}-` + dayForm + outer + `$`
	timeForm  = `^` + outer + `\d{4}-` + dayForm + `T(?:[01]?\d|2[0-3]):[0-5]\d:[0-5]\d(?:[.,]\d+)?(?:Z|[-+](?:[01]\d|2[0-4]):(?:[0-5]\d|60))` + outer + `$`
	yesNoForm = `^(?:[yY][eE][sS]|[nN][oO]|[tT][rR][uU][eE]|[fF][aA][lL][sS][eE])$`
)
