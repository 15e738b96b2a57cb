package settings

import (
	"strconv"
	"strings"

	"go.yaml.in/yaml/v4"
)

// checkLayouts has the layouts of all feeds checked and puts what is wrong with
// them in its place.
func (r *reader) checkLayouts(s *Settings, root *yaml.Node, checks []Check) {
	seen := map[string]bool{}
	for i := range s.Feeds {
		layout := &s.Feeds[i].Layout
		for _, check := range checks {
			err := check(layout)
			if err == nil {
				continue
			}
			for line := range strings.Lines(err.Error()) {
				field, wrong, _ := strings.Cut(strings.TrimSpace(line), ": ")
				path := "layouts." + layout.Name + "." + field
				if !seen[path+wrong] {
					seen[path+wrong] = true
					r.fault(nodeAt(root, path), path, "", "%s", wrong)
				}
			}
		}
	}
}

// nodeAt returns the node that a path such as layouts.daily.values[2].unit leads
// to, or the last before it that there is.
func nodeAt(n *yaml.Node, path string) *yaml.Node {
	for _, key := range strings.Split(path, ".") {
		key, places, _ := strings.Cut(key, "[")
		next := child(n, key)
		if next == nil {
			return n
		}
		n = next
		if i, err := strconv.Atoi(strings.TrimSuffix(places, "]")); err == nil && n.Kind == yaml.SequenceNode && i < len(n.Content) {
			n = n.Content[i]
		}
	}
	return n
}

func child(n *yaml.Node, key string) *yaml.Node {
	if n.Kind != yaml.MappingNode {
		return nil
	}
	for i := 0; i+1 < len(n.Content); i += 2 {
		if n.Content[i].Value == key {
			return n.Content[i+1]
		}
	}
	return nil
}
