package table

import (
	"fmt"

	"go.yaml.in/yaml/v3"
)

// metaOf reads a plain map, or !!omap as a list of maps of one key.
func metaOf(n *yaml.Node, left *int) ([]KV, error) {
	if n.Kind == yaml.AliasNode {
		n = n.Alias
	}
	var out []KV
	add := func(pair []*yaml.Node) error {
		if len(pair) != 2 || pair[0].Kind != yaml.ScalarNode {
			return fmt.Errorf("expected key: value")
		}
		v, err := valueOf(pair[1], left)
		if err != nil {
			return err
		}
		out = append(out, KV{pair[0].Value, v})
		return nil
	}
	switch {
	case n.Kind == yaml.MappingNode:
		for i := 0; i+1 < len(n.Content); i += 2 {
			if err := add(n.Content[i : i+2]); err != nil {
				return nil, err
			}
		}
	case n.Kind == yaml.SequenceNode && n.Tag == "!!omap":
		for _, e := range n.Content {
			if e.Kind != yaml.MappingNode {
				return nil, fmt.Errorf("expected - key: value")
			}
			if err := add(e.Content); err != nil {
				return nil, err
			}
		}
	case n.Kind == yaml.ScalarNode && n.Tag == "!!null":
	default:
		return nil, fmt.Errorf("expected a map or !!omap")
	}
	return out, checkMeta(out, "meta")
}

// valueOf turns a YAML node into a metadata value; left bounds the number of
// nodes, so that aliases of aliases cannot blow up.
func valueOf(n *yaml.Node, left *int) (any, error) {
	if *left--; *left < 0 {
		return nil, fmt.Errorf("too much metadata")
	}
	switch n.Kind {
	case yaml.AliasNode:
		return valueOf(n.Alias, left)
	case yaml.MappingNode:
		return metaOf(n, left)
	case yaml.SequenceNode:
		if n.Tag == "!!omap" {
			return metaOf(n, left)
		}
		out := make([]any, 0, len(n.Content))
		for _, e := range n.Content {
			v, err := valueOf(e, left)
			if err != nil {
				return nil, err
			}
			out = append(out, v)
		}
		return out, nil
	}
	var err error
	switch n.Tag {
	case "!!null":
		return nil, nil
	case "!!bool":
		var b bool
		err = n.Decode(&b)
		return b, err
	case "!!int":
		var i int64
		if err = n.Decode(&i); err == nil {
			return i, nil
		}
		return n.Value, nil // beyond 64 bits: kept as its text
	case "!!float":
		var x float64
		err = n.Decode(&x)
		return x, err
	}
	return n.Value, nil
}
