package surface

import "thawledger/pipeline"

// Stated is an n-factor as its source states it.
type Stated struct {
	Low, High float64 // the same where the source states one number
	OpenAbove bool    // the source has "+": High is not the end
	// Central is the number to use where the source states one.
	Central    float64
	HasCentral bool
}

// Published is a published n-factor to choose from.
type Published struct {
	ID                 string // never changes its meaning
	Surface            string
	Thaw               Stated // n_t, if HasThaw
	Freeze             Stated // n_f, if HasFreeze
	HasThaw, HasFreeze bool
	Note               string // what has to be known to use it
	Source             string
}

// Of returns the n-factor for a kind of season, if the source states one: n_t
// for thaw, n_f for freeze.
func (p *Published) Of(kind pipeline.Kind) (Stated, bool) {
	switch kind {
	case pipeline.Thaw:
		return p.Thaw, p.HasThaw
	case pipeline.Freeze:
		return p.Freeze, p.HasFreeze
	}
	return Stated{}, false
}

// one is a source's single number.
func one(n float64) Stated { return Stated{Low: n, High: n, Central: n, HasCentral: true} }

// between is a source's range, without a number to use.
func between(low, high float64) Stated { return Stated{Low: low, High: high} }

// above is a source's "low to high+".
func above(low, high float64) Stated { return Stated{Low: low, High: high, OpenAbove: true} }

const (
	army = "US Army TM 5-852-4 / AFM 88-19 ch. 4, 1983, Table 4-1"
	bare = "exposed to sun and air, without dust, soil, snow or ice on it and without heat from a building"
	snow = "n_f depends on the winter's snow: by more than 0.2 from year to year at one place"
	// openTop goes with a thaw n of "low to 2+".
	openTop = bare + "; the source states a range open above and no number to use: choose one for the place, higher at very high latitude"
)

// Table lists the built-in published n-factors, in a fixed order. They are to
// choose from: none is ever taken by default, and one measured on the surface
// itself is better (Measured).
func Table() []Published {
	return []Published{
		{
			ID: "tm_snow", Surface: "snow surface",
			Freeze: one(1.0), HasFreeze: true, Source: army,
		},
		{
			ID: "tm_concrete", Surface: "Portland cement concrete",
			Thaw: one(1.5), HasThaw: true, Freeze: one(0.75), HasFreeze: true, Note: bare, Source: army,
		},
		{
			ID: "tm_bituminous", Surface: "bituminous pavement",
			Thaw: above(1.6, 2), HasThaw: true, Freeze: one(0.7), HasFreeze: true, Note: openTop, Source: army,
		},
		{
			ID: "tm_bare_soil", Surface: "bare soil",
			Thaw: above(1.4, 2), HasThaw: true, Freeze: one(0.7), HasFreeze: true, Note: openTop, Source: army,
		},
		{
			ID: "tm_shaded", Surface: "shaded surface",
			Thaw: one(1.0), HasThaw: true, Freeze: one(0.9), HasFreeze: true, Source: army,
		},
		{
			ID: "tm_turf", Surface: "turf",
			Thaw: one(0.8), HasThaw: true, Freeze: one(0.5), HasFreeze: true, Source: army,
		},
		{
			ID: "tm_trees", Surface: "tree-covered ground",
			Thaw: one(0.4), HasThaw: true, Freeze: one(0.3), HasFreeze: true, Note: snow, Source: army,
		},
		{
			ID: "tundra_circles", Surface: "bare nonsorted circles in tundra, Arctic Alaska",
			Thaw: between(0.74, 1.43), HasThaw: true,
			Note:   "measured along a gradient of climate: 1.43 in the north, 0.74 in the south",
			Source: "A. Kade et al., 2006, abstract",
		},
		{
			ID: "kuparuk_tundra", Surface: "tundra under snow, Kuparuk basin, Alaska",
			Freeze: between(0.32, 0.58), HasFreeze: true,
			Note:   "means of 12 winters at plots; within a plot the range is 0.18 to 0.28",
			Source: "A. E. Klene et al., 2008, abstract",
		},
		{
			ID: "whitehorse", Surface: "natural ground, Whitehorse area, Yukon",
			Thaw: between(0.80, 1.08), HasThaw: true, Freeze: between(0.12, 0.73), HasFreeze: true, Note: snow,
			Source: "Ninth International Conference on Permafrost (NICOP), 2008, p. 295 of the volume as scanned",
		},
		{
			ID: "slope_tundra", Surface: "tundra, northern Alaska",
			Thaw: one(1.0), HasThaw: true, Freeze: one(0.5), HasFreeze: true,
			Note: "assumed in the modelling of a road, not measured", Source: road,
		},
		{
			ID: "slope_gravel", Surface: "gravel road, kept free of snow, northern Alaska",
			Thaw: one(1.25), HasThaw: true, Freeze: one(0.95), HasFreeze: true,
			Note: "assumed in the modelling of a road, not measured", Source: road,
		},
	}
}

const road = "J. Infrastruct. Preserv. Resil., 2021, doi 10.1186/s43065-021-00025-2, Table 3"

// Lookup returns the published n-factor of an ID.
func Lookup(id string) (Published, bool) {
	for _, p := range Table() {
		if p.ID == id {
			return p, true
		}
	}
	return Published{}, false
}
