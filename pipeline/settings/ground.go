package settings

import (
	"fmt"
	"slices"

	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

// The keys of a layer of the ground: which of the two it is stated by.
var (
	soilKeys    = []string{"texture", "dry_density_kg_m3", "water_pct_dry", "method", "quartz_share"}
	thermalKeys = []string{"k_thawed_w_mk", "k_frozen_w_mk", "c_thawed_j_m3k", "c_frozen_j_m3k", "latent_j_m3"}
)

// ground reads the layers under a surface, from the top.
func (r *reader) ground(o *object) (layers []pipeline.Layer) {
	n := o.list("ground", func(n *yaml.Node, path string) {
		layers = append(layers, r.layer(r.object(n, path, n)))
	})
	if n == nil || n.Kind != yaml.SequenceNode {
		return nil
	}
	if len(layers) == 0 {
		r.fault(n, o.at("ground"), "list the layers from the top, or leave it out", "it has no layers")
	}
	for i := range layers {
		if entry := n.Content[i]; layers[i].ThicknessM == 0 && i < len(layers)-1 && entry.Kind == yaml.MappingNode {
			r.fault(entry, fmt.Sprintf("%s[%d].thickness_m", o.at("ground"), i), "write a number from 0.001 to 1000", "it is missing, and only the last layer may go on below")
		}
	}
	return layers
}

func (r *reader) layer(o *object) pipeline.Layer {
	below := 0.0
	l := pipeline.Layer{Source: o.text("source", "say where its properties were taken from")}
	if o.has("thickness_m") {
		l.ThicknessM = o.number("thickness_m", nil, 0.001, 1000)
	} else {
		o.number("thickness_m", &below, 0, 0)
	}
	soil, thermal := slices.ContainsFunc(soilKeys, o.has), slices.ContainsFunc(thermalKeys, o.has)
	const right = "state it by composition (texture, dry_density_kg_m3, water_pct_dry, method) or by thermal properties (k_thawed_w_mk, ...)"
	switch {
	case o.bad:
	case soil && thermal:
		r.fault(o.node, o.path, right, "it has keys of both kinds")
		o.known = append(append(o.known, soilKeys...), thermalKeys...)
	case soil:
		l.Soil = o.soil()
	case thermal:
		l.Thermal = &pipeline.Thermal{
			KThawedWMK: o.number("k_thawed_w_mk", nil, 0.005, 20), KFrozenWMK: o.number("k_frozen_w_mk", nil, 0.005, 20),
			CThawedJM3K: o.number("c_thawed_j_m3k", nil, 1e4, 1e7), CFrozenJM3K: o.number("c_frozen_j_m3k", nil, 1e4, 1e7),
			LatentJM3: o.number("latent_j_m3", nil, 0, 3.4e8),
		}
	default:
		r.fault(o.node, o.path, right, "it says nothing of the ground")
		o.known = append(append(o.known, soilKeys...), thermalKeys...)
	}
	o.done()
	return l
}

// soil reads a layer's composition.
func (o *object) soil() *pipeline.Soil {
	s := &pipeline.Soil{
		Texture: oneOf(o, "texture", "", pipeline.FineSoil, pipeline.CoarseSoil), Method: oneOf(o, "method", "", pipeline.Kersten, pipeline.Johansen),
		DryDensityKgM3: o.number("dry_density_kg_m3", nil, 50, 2700), WaterPctDry: o.number("water_pct_dry", nil, 0, 2000),
	}
	switch n := o.get("quartz_share"); {
	case s.Method == pipeline.Johansen:
		s.QuartzShare = o.number("quartz_share", nil, 0, 1)
	case n != nil:
		o.r.fault(n, o.at("quartz_share"), "leave it out, or write method: johansen", "%s's formula has no quartz in it", s.Method)
	}
	return s
}

// limit reads how a design value is stated: as an index in a unit, or as a depth of
// thaw, which Ground turns into one.
func (o *object) limit(d *pipeline.DesignValue) {
	n := o.get("depth_m")
	if n == nil {
		d.Index, d.Unit = o.number("index", nil, 0.001, 1e7), o.indexUnit()
		return
	}
	depth := o.number("depth_m", nil, 0.001, 1000)
	d.DepthM, d.Unit = &depth, pipeline.DegCDays
	for _, key := range []string{"index", "unit"} {
		if extra := o.get(key); extra != nil {
			o.r.fault(extra, o.at(key), "leave it out, or write index and unit without depth_m", "the value is stated as a depth")
		}
	}
	for _, c := range []struct {
		key, right, wrong string
		bad               bool
	}{
		{"kind", "write kind: thaw, or an index", "a depth is one of thaw", d.Kind != pipeline.Thaw},
		{"of", "write of: surface, or an index", "a depth is reached from the surface", d.Of != pipeline.OfSurface},
		{"base_c", "write 0, or an index", "a depth of thaw counts from 0 degC", d.BaseC != 0},
	} {
		if at := o.vals[c.key]; c.bad && at != nil {
			o.r.fault(at, o.at(c.key), c.right, "%s", c.wrong)
		}
	}
}

func writeGround(t *tree, layers []pipeline.Layer) {
	if len(layers) == 0 {
		return
	}
	t.list("ground", len(layers), func(i int, t *tree) {
		l := &layers[i]
		if l.ThicknessM > 0 {
			t.number("thickness_m", l.ThicknessM)
		}
		if s := l.Soil; s != nil {
			t.text("texture", string(s.Texture))
			t.number("dry_density_kg_m3", s.DryDensityKgM3)
			t.number("water_pct_dry", s.WaterPctDry)
			t.text("method", string(s.Method))
			if s.Method == pipeline.Johansen {
				t.number("quartz_share", s.QuartzShare)
			}
		}
		if h := l.Thermal; h != nil {
			t.number("k_thawed_w_mk", h.KThawedWMK)
			t.number("k_frozen_w_mk", h.KFrozenWMK)
			t.number("c_thawed_j_m3k", h.CThawedJM3K)
			t.number("c_frozen_j_m3k", h.CFrozenJM3K)
			t.number("latent_j_m3", h.LatentJM3)
		}
		t.text("source", l.Source)
	})
}

// places is where sites stand in the file, for faults that only others can find.
type places struct {
	file  string
	sites []*yaml.Node
}

// Ground has all profiles looked at, and design values that are stated as a depth
// of thaw turned into the surface index that reaches it; their source says so. build
// says which layer, from 0, cannot be, or nil; toThaw returns the surface index in
// degC.d. The error is a Faults.
func (s *Settings) Ground(build func([]pipeline.Layer) (int, error), toThaw func([]pipeline.Layer, float64) (float64, error)) error {
	r := &reader{file: s.places.file}
	for i := range s.Sites {
		site, root := &s.Sites[i], s.places.sites[i]
		for j := range site.Surfaces {
			surface, path := &site.Surfaces[j], fmt.Sprintf("surfaces[%d]", j)
			at := func(key string) (*yaml.Node, string) {
				return nodeAt(root, path+"."+key), fmt.Sprintf("sites[%d].%s.%s", i, path, key)
			}
			if len(surface.Ground) == 0 {
				continue
			}
			if layer, err := build(surface.Ground); err != nil {
				n, path := at(fmt.Sprintf("ground[%d]", layer))
				r.fault(n, path, "", "%v", err)
				continue
			}
			for k := range surface.Designs {
				d := &surface.Designs[k]
				if d.DepthM == nil || d.Index != 0 {
					continue
				}
				n, path := at(fmt.Sprintf("design_values[%d].depth_m", k))
				index, err := toThaw(surface.Ground, *d.DepthM)
				switch {
				case err != nil:
					r.fault(n, path, "", "a depth of %g m: %v", *d.DepthM, err)
				case index < 0.001:
					r.fault(n, path, "write a depth in ground that holds water", "thaw is past %g m at once: the ground above is dry", *d.DepthM)
				default:
					d.Index = index
					d.Source += fmt.Sprintf(" [%g m of thaw, as a surface index of %.1f degC.d by the layered Stefan formula]", *d.DepthM, index)
				}
			}
		}
	}
	if len(r.faults) > 0 {
		return r.faults.sorted()
	}
	return nil
}
