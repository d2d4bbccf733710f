package record

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"reflect"
	"strings"
	"sync"
)

// Other is the body of a kind that this version does not know. It is shown, kept and never judged.
type Other struct {
	Name string
	JSON json.RawMessage
}

// Kind is the kind as the line gives it.
func (o Other) Kind() string { return o.Name }

// MarshalJSON writes the body as it came.
func (o Other) MarshalJSON() ([]byte, error) { return o.JSON, nil }

// BodyError says which kind of body could not be read, and why.
type BodyError struct {
	Of  string // the kind
	Err error
}

func (e *BodyError) Error() string { return fmt.Sprintf("body of %q: %v", e.Of, e.Err) }

// Unwrap gives the reason.
func (e *BodyError) Unwrap() error { return e.Err }

// Decode reads the body of a line of the given kind. A kind that this version does not know comes back as [Other].
//
// Fields that this version does not know are allowed, and stay readable in the line itself. A key that differs from a
// known one only in case, or stands twice, is an error: package json would take either for the known one.
func Decode(kind string, body []byte) (Body, error) {
	target, ok := blank[kind]
	if !ok {
		return Other{Name: kind, JSON: bytes.Clone(body)}, nil
	}
	fresh := reflect.New(reflect.TypeOf(target))
	if err := checkKeys(body, fresh.Type().Elem()); err != nil {
		return nil, &BodyError{kind, err}
	}
	if err := json.Unmarshal(body, fresh.Interface()); err != nil {
		return nil, &BodyError{kind, err}
	}
	return fresh.Elem().Interface().(Body), nil
}

// Known tells whether this version knows the kind.
func Known(kind string) bool { _, ok := blank[kind]; return ok }

// Kinds are the kinds that this version knows, in the order in which a log usually first has them.
func Kinds() []string {
	kinds := make([]string, len(bodies))
	for i, b := range bodies {
		kinds[i] = b.Kind()
	}
	return kinds
}

// bodies holds one empty body of each kind.
var bodies = []Body{Opened{}, File{}, Person{}, Instrument{}, Reading{}, Capture{}, Finding{}, Stage{}, Point{}, Attempt{},
	Deviation{}, Punch{}, Note{}, Setting{}, Link{}, Clock{}, Hastened{}, Resumed{}, SignOff{}, Seal{}}

var blank = func() map[string]Body {
	m := map[string]Body{}
	for _, b := range bodies {
		m[b.Kind()] = b
	}
	return m
}()

// checkKeys walks one JSON value beside the type that will take it.
func checkKeys(value []byte, t reflect.Type) error {
	d := json.NewDecoder(bytes.NewReader(value))
	d.UseNumber()
	if open, err := d.Token(); err != nil || open != json.Delim('{') {
		return errors.New("wanted an object")
	}
	if err := checkObject(d, t); err != nil {
		return err
	}
	if _, err := d.Token(); err != io.EOF {
		return errors.New("text after the object")
	}
	return nil
}

func checkObject(d *json.Decoder, t reflect.Type) error {
	fields := fieldsOf(t)
	seen := map[string]bool{}
	for d.More() {
		token, err := d.Token()
		if err != nil {
			return err
		}
		key := token.(string)
		folded := fold(key)
		if seen[folded] {
			return fmt.Errorf("key %q stands twice, if only in another case", key)
		}
		seen[folded] = true
		field, known := fields[folded]
		if known && field.name != key {
			return fmt.Errorf("key %q differs from %q in case", key, field.name)
		}
		if err := checkValue(d, field.of); err != nil {
			return err
		}
	}
	_, err := d.Token()
	return err
}

func checkValue(d *json.Decoder, t reflect.Type) error {
	if t == raw { // kept as it stands; the line's own reader has looked at its keys
		return d.Decode(&json.RawMessage{})
	}
	token, err := d.Token()
	if err != nil {
		return err
	}
	switch token {
	case json.Delim('{'):
		return checkObject(d, t)
	case json.Delim('['):
		for d.More() {
			if err := checkValue(d, elementOf(t)); err != nil {
				return err
			}
		}
		_, err := d.Token()
		return err
	}
	return nil
}

type field struct {
	name string
	of   reflect.Type
}

// fieldsByType keeps what fieldsOf has found out: by type, as every line asks again.
var fieldsByType sync.Map // reflect.Type to map[string]field

// fieldsOf gives the JSON fields of a struct by folded name; nothing for any other type.
func fieldsOf(t reflect.Type) map[string]field {
	if found, ok := fieldsByType.Load(t); ok {
		return found.(map[string]field)
	}
	fields := readFields(t)
	fieldsByType.Store(t, fields)
	return fields
}

func readFields(t reflect.Type) map[string]field {
	for t != nil && t.Kind() == reflect.Pointer {
		t = t.Elem()
	}
	if t == nil || t.Kind() != reflect.Struct || reflect.PointerTo(t).Implements(unmarshaler) {
		return nil
	}
	fields := map[string]field{}
	for i := range t.NumField() {
		name, _, _ := strings.Cut(t.Field(i).Tag.Get("json"), ",")
		if name != "" && name != "-" {
			fields[fold(name)] = field{name, t.Field(i).Type}
		}
	}
	return fields
}

var (
	unmarshaler = reflect.TypeFor[json.Unmarshaler]()
	raw         = reflect.TypeFor[json.RawMessage]()
)

func elementOf(t reflect.Type) reflect.Type {
	if t != nil && t.Kind() == reflect.Slice && t != raw {
		return t.Elem()
	}
	return nil
}

// fold makes keys that package json would take for one another equal: it folds case and, as that package does, the two
// letters outside ASCII that fold into it.
func fold(key string) string {
	return foldBeyondASCII.Replace(strings.ToLower(key))
}

var foldBeyondASCII = strings.NewReplacer("\u017f", "s", "\u212a", "k")
