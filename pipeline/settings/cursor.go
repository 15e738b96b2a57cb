package settings

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"time"

	"go.yaml.in/yaml/v4"
)

// reader gathers what is wrong while settings are read.
type reader struct {
	file      string
	faults    Faults
	warnings  []Warning
	defaulted map[string]bool // paths that the file leaves to their defaults
}

func (r *reader) fault(n *yaml.Node, path, right, wrong string, args ...any) {
	if n == nil { // about something that the file does not have
		n = &yaml.Node{Line: 1, Column: 1}
	}
	r.faults = append(r.faults, Fault{r.file, n.Line, n.Column, path, fmt.Sprintf(wrong, args...), right})
}

func (r *reader) warn(n *yaml.Node, path, format string, args ...any) {
	r.warnings = append(r.warnings, Warning{r.file, n.Line, n.Column, path, fmt.Sprintf(format, args...), ""})
}

// object is a mapping whose keys are asked for one by one; done reports those
// that nobody asked for.
type object struct {
	r     *reader
	node  *yaml.Node
	path  string
	keys  map[string]*yaml.Node // the key's node
	vals  map[string]*yaml.Node
	known []string
	bad   bool // not a mapping
}

// object begins a mapping. A nil node is an empty one at the place of around.
func (r *reader) object(n *yaml.Node, path string, around *yaml.Node) *object {
	o := &object{r: r, node: n, path: path, keys: map[string]*yaml.Node{}, vals: map[string]*yaml.Node{}}
	if n == nil {
		o.node = around
		return o
	}
	if n.Kind != yaml.MappingNode {
		r.fault(n, path, "write `key: value` lines", "%s is not a mapping", shown(n))
		o.bad = true
		return o
	}
	for i := 0; i+1 < len(n.Content); i += 2 {
		k, v := n.Content[i], n.Content[i+1]
		if first, ok := o.keys[k.Value]; ok {
			r.fault(k, o.at(k.Value), "leave one of them out", "the key stands here for a second time, the first time in line %d", first.Line)
			continue
		}
		o.keys[k.Value], o.vals[k.Value] = k, v
	}
	return o
}

func (o *object) at(key string) string {
	if o.path == "" {
		return key
	}
	return o.path + "." + key
}

// get returns a key's value; nil if it is not given or empty.
func (o *object) get(key string) *yaml.Node {
	o.known = append(o.known, key)
	v := o.vals[key]
	if v == nil || empty(v) {
		return nil
	}
	if v.Kind == yaml.AliasNode {
		o.r.fault(v, o.at(key), "write the value out", "aliases are not allowed")
		delete(o.vals, key)
		return nil
	}
	return v
}

// has reports whether a key is given and not empty.
func (o *object) has(key string) bool {
	v := o.vals[key]
	return v != nil && !empty(v)
}

func empty(v *yaml.Node) bool { return v.Kind == yaml.ScalarNode && v.Tag == "!!null" }

// done reports keys that were not asked for.
func (o *object) done() {
	for key, k := range o.keys {
		if slices.Contains(o.known, key) {
			continue
		}
		right := "known here are " + strings.Join(o.known, ", ")
		if near := nearest(key, o.known); near != "" {
			right = fmt.Sprintf("did you mean %s?", near)
		}
		o.r.fault(k, o.at(key), right, "there is no such key")
	}
}

func (o *object) missing(key, right string) {
	if !o.bad {
		o.r.fault(o.node, o.at(key), right, "it is missing")
	}
}

// scalar returns the text of a single value.
func (o *object) scalar(key string) (text string, n *yaml.Node) {
	if n = o.get(key); n == nil {
		return "", nil
	}
	if n.Kind != yaml.ScalarNode {
		o.r.fault(n, o.at(key), "write one value", "%s is not a single value", shown(n))
		return "", nil
	}
	return n.Value, n
}

func (o *object) fallBack(key string) { o.r.defaulted[o.at(key)] = true }

// text returns a text; what right says is wanted if it is missing.
func (o *object) text(key, right string) string {
	text, n := o.scalar(key)
	if n == nil || text == "" {
		if !o.has(key) || n != nil {
			o.missing(key, right)
		}
	}
	return text
}

func (o *object) textOr(key, otherwise string) string {
	text, n := o.scalar(key)
	if n == nil {
		o.fallBack(key)
		return otherwise
	}
	return text
}

// number returns a finite number between least and most. Without a default it
// is required.
func (o *object) number(key string, otherwise *float64, least, most float64) float64 {
	text, n := o.scalar(key)
	want := fmt.Sprintf("write a number from %g to %g", least, most)
	if n == nil {
		if otherwise == nil {
			if !o.has(key) {
				o.missing(key, want)
			}
			return 0
		}
		o.fallBack(key)
		return *otherwise
	}
	v, err := strconv.ParseFloat(text, 64)
	if err != nil || math.IsNaN(v) || v < least || v > most {
		o.r.fault(n, o.at(key), want, "%q will not do", text)
		return least
	}
	return v
}

func (o *object) whole(key string, otherwise *float64, least, most float64) int {
	v := o.number(key, otherwise, least, most)
	if v != math.Trunc(v) {
		o.r.fault(o.vals[key], o.at(key), "write a whole number", "%g is not whole", v)
	}
	return int(v)
}

// yes returns true or false; false where the key is not given.
func (o *object) yes(key string) bool {
	text, n := o.scalar(key)
	switch {
	case n == nil:
		o.fallBack(key)
	case text == "true":
		return true
	case text != "false":
		o.r.fault(n, o.at(key), "write true or false", "%q will not do", text)
	}
	return false
}

// oneOf returns one of the words known.
func oneOf[T ~string](o *object, key string, otherwise T, known ...T) T {
	text, n := o.scalar(key)
	var words []string
	for _, k := range known {
		words = append(words, string(k))
	}
	right := "write one of " + strings.Join(words, ", ")
	switch {
	case n == nil && otherwise != "":
		o.fallBack(key)
		return otherwise
	case n == nil:
		if !o.has(key) {
			o.missing(key, right)
		}
		return known[0]
	case !slices.Contains(words, text):
		o.r.fault(n, o.at(key), right, "%q is not known", text)
		return known[0]
	}
	return T(text)
}

// duration returns a length of time such as 2m30s.
func (o *object) duration(key string, otherwise time.Duration) time.Duration {
	text, n := o.scalar(key)
	if n == nil {
		o.fallBack(key)
		return otherwise
	}
	d, err := time.ParseDuration(text)
	if err != nil || d < 0 {
		o.r.fault(n, o.at(key), "write a length of time such as 90s, 5m or 1h30m", "%q is none", text)
		return otherwise
	}
	return d
}

// list calls f for each entry of a list.
func (o *object) list(key string, f func(n *yaml.Node, path string)) (n *yaml.Node) {
	if n = o.get(key); n == nil {
		return nil
	}
	if n.Kind != yaml.SequenceNode {
		o.r.fault(n, o.at(key), "write a list", "%s is not a list", shown(n))
		return n
	}
	for i, entry := range n.Content {
		f(entry, fmt.Sprintf("%s[%d]", o.at(key), i))
	}
	return n
}

// texts returns a list of texts.
func (o *object) texts(key string) (out []string) {
	o.list(key, func(n *yaml.Node, path string) {
		if n.Kind != yaml.ScalarNode {
			o.r.fault(n, path, "write one value", "%s is not a single value", shown(n))
			return
		}
		out = append(out, n.Value)
	})
	return out
}

func shown(n *yaml.Node) string {
	switch n.Kind {
	case yaml.MappingNode:
		return "a mapping"
	case yaml.SequenceNode:
		return "a list"
	case yaml.AliasNode:
		return "an alias"
	}
	return fmt.Sprintf("%q", n.Value)
}
